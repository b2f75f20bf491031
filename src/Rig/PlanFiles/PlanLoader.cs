using Halfvoice.Plans;

namespace Halfvoice.Rig.PlanFiles;

/// <summary>Reads a plan folder for a command, or ends the command with all that is wrong.</summary>
public static class PlanLoader
{
    /// <exception cref="RigException">The plan is wrong (exit code 2).</exception>
    public static (Plan Plan, IReadOnlyList<PlanWarning> Warnings) Load(string folder)
    {
        var reading = PlanReader.Read(new FolderPlanFiles(folder));
        if (reading.Plan is { } plan)
            return (plan, reading.Warnings);
        var count = reading.Errors.Count == 1 ? "1 error" : $"{reading.Errors.Count} errors";
        var lines = reading.ErrorLines().Prepend($"The plan in {folder} has {count}:");
        throw new RigException(ExitCodes.PlanWrong, string.Join(Environment.NewLine, lines));
    }
}
