using Halfvoice.Plans;
using Halfvoice.Rig.Binaries;
using Halfvoice.Rig.PlanFiles;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>Where things are in the source checkout that the tests were built from.</summary>
internal static class Checkout
{
    private static readonly Lazy<Task<AgentBinaries>> _binaries =
        new(() => AgentBinaries.LocateAsync(new BinaryOptions(), _ => { }, CancellationToken.None));

    /// <summary>The folder that holds the solution.</summary>
    public static string Folder { get; } = FindFolder();

    public static string Demo => Path.Combine(Folder, "deploy", "plans", "sallow-reach");

    public static string Sample => Path.Combine(Folder, "deploy", "plans", "three-fords");

    /// <summary>Agent and coordinator, built once; ahead of time where this machine can.</summary>
    public static Task<AgentBinaries> BinariesAsync() => _binaries.Value;

    /// <summary>Starts the rig's own executable.</summary>
    public static LineProcess StartRig(params string[] arguments) => LineProcess.Start(
        "the rig", Environment.ProcessPath is { } host && Path.GetFileNameWithoutExtension(host) == "dotnet" ? host : "dotnet",
        [Path.Combine(AppContext.BaseDirectory, "halfvoice.dll"), .. arguments], workingFolder: Folder);

    /// <summary>Runs the rig to its end.</summary>
    public static async Task<(int ExitCode, string Output, string Errors)> RunRigAsync(CancellationToken cancel, params string[] arguments)
    {
        await using var rig = StartRig(arguments);
        var code = await rig.EndAsync(cancel);
        return (code, rig.Output, rig.Errors);
    }

    public static Plan Load(string folder) => PlanLoader.Load(folder).Plan;

    /// <summary>Copies a plan folder with some lines of plan.yaml replaced.</summary>
    public static string CopyPlan(string from, string to, params (string Old, string New)[] changes)
    {
        foreach (var file in Directory.EnumerateFiles(from, "*", SearchOption.AllDirectories))
        {
            var target = Path.Combine(to, Path.GetRelativePath(from, file));
            Directory.CreateDirectory(Path.GetDirectoryName(target)!);
            File.Copy(file, target);
        }

        var yaml = Path.Combine(to, "plan.yaml");
        var text = File.ReadAllText(yaml);
        foreach (var (old, replacement) in changes)
        {
            Assert.Contains(old, text, StringComparison.Ordinal);
            text = text.Replace(old, replacement, StringComparison.Ordinal);
        }

        File.WriteAllText(yaml, text);
        return to;
    }

    private static string FindFolder()
    {
        for (var folder = new DirectoryInfo(AppContext.BaseDirectory); folder is not null; folder = folder.Parent)
        {
            if (File.Exists(Path.Combine(folder.FullName, "Agents.sln")))
                return folder.FullName;
        }

        throw new DirectoryNotFoundException("No folder above the tests holds Agents.sln.");
    }
}
