using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>
/// What reading a plan folder, or importing a file, came to. There is a plan exactly if there is no error. Errors are
/// sorted by file, line and column.
/// </summary>
public sealed record PlanReading(Plan? Plan, IReadOnlyList<PlanError> Errors, IReadOnlyList<PlanWarning> Warnings)
{
    /// <summary>Lines for a terminal: every error, at most <paramref name="perFile"/> of a file with a count of the rest.</summary>
    public IEnumerable<string> ErrorLines(int perFile = 50)
    {
        foreach (var file in Errors.GroupBy(error => error.File))
        {
            foreach (var error in file.Take(perFile))
                yield return error.Text;
            var count = file.Count();
            var unread = count > PlanFileRules.MaxErrorsPerFile ? ", and its rest was not read" : "";
            if (count <= perFile)
                continue;
            yield return string.Create(
                CultureInfo.InvariantCulture,
                $"{file.Key}: and {count - perFile} more errors in this file{unread}");
        }
    }
}
