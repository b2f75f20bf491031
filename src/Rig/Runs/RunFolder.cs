using System.Globalization;
using Halfvoice.Rig.Authority;

namespace Halfvoice.Rig.Runs;

/// <summary>
/// Where a run leaves everything: runs/UTC-NAME with verdict.json, record.sqlite (what the coordinator saw), truth.sqlite
/// (private: true loads and the delivered dispatch), logs/, plan/ as used, and the bundles and states of all processes.
/// </summary>
public sealed class RunFolder
{
    private RunFolder(string path) => Path = path;

    public string Path { get; }

    public string Bundles => Sub("bundles");

    public string States => Sub("states");

    public string Logs => Sub("logs");

    public string Plan => Sub("plan");

    public string Verdict => Sub("verdict.json");

    public string Record => Sub("record.sqlite");

    public string Truth => Sub("truth.sqlite");

    public string CoordinatorState => System.IO.Path.Combine(States, "coordinator");

    public string SiteState(string site) => System.IO.Path.Combine(States, "sites", site);

    /// <summary>Makes a new run folder, readable by its owner only.</summary>
    /// <exception cref="RigException">It cannot be made.</exception>
    public static RunFolder Create(string runs, string planName, DateTimeOffset now)
    {
        var slug = string.Concat(planName.ToLowerInvariant().Select(c => char.IsAsciiLetterOrDigit(c) ? c : '-')).Trim('-');
        while (slug.Contains("--", StringComparison.Ordinal))
            slug = slug.Replace("--", "-", StringComparison.Ordinal);
        var stem = now.UtcDateTime.ToString("yyyyMMdd'T'HHmmss'Z'", CultureInfo.InvariantCulture) + "-" + (slug.Length > 40 ? slug[..40] : slug);
        try
        {
            Directory.CreateDirectory(runs);
            for (var i = 1; ; i++)
            {
                var path = System.IO.Path.Combine(System.IO.Path.GetFullPath(runs), i == 1 ? stem : $"{stem}-{i}");
                if (Directory.Exists(path))
                    continue;
                PrivateFiles.MakeFolder(path);
                var folder = new RunFolder(path);
                foreach (var sub in new[] { folder.Bundles, folder.States, folder.Logs, folder.Plan })
                    PrivateFiles.MakeFolder(sub);
                return folder;
            }
        }
        catch (Exception problem) when (problem is IOException or UnauthorizedAccessException)
        {
            throw new RigException(ExitCodes.Broke, $"The run folder cannot be made under {runs}: {problem.Message}", problem);
        }
    }

    private string Sub(string name) => System.IO.Path.Combine(Path, name);
}
