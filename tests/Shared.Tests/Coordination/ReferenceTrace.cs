using System.Diagnostics;
using System.Globalization;
using System.Text.Json;
using Halfvoice.Plans;
using Halfvoice.Tests.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>
/// Runs the executable specification of scheme injection beside the project and reads its trace. It needs Python with numpy,
/// scipy and cvxopt; where one is missing the calling test is skipped and says which.
/// </summary>
internal static class ReferenceTrace
{
    private const string Python = "/usr/bin/python3";

    private static string Script => Path.Combine(PlanFolders.Repository, "..", "shared", "prototypes", "reference.py");

    /// <param name="caseName">One of the published cases, one bus a site.</param>
    /// <param name="rounds">Most rounds.</param>
    /// <param name="noiseMw">Scale of the reference's own noise on the announced loads, MW.</param>
    public static JsonDocument Injection(string caseName, int rounds, double noiseMw = 0)
    {
        var folder = PlanFolders.Case(caseName);
        Assert.SkipUnless(File.Exists(Script), "The reference study (../shared/prototypes/reference.py) is not beside this project.");
        Assert.SkipUnless(File.Exists(Python), "Python 3 is not installed on this machine.");
        foreach (var module in new[] { "numpy", "scipy", "cvxopt" })
            Assert.SkipUnless(Run("-c", "import " + module).ExitCode == 0, $"Python's module {module} is not installed on this machine.");
        var trace = Path.GetTempFileName();
        try
        {
            var (exitCode, error) = Run(
                Script, folder, "--scheme", "injection", "--rounds", rounds.ToString(CultureInfo.InvariantCulture), "--trace", trace,
                "--noise", noiseMw.ToString(CultureInfo.InvariantCulture));
            Assert.True(exitCode == 0, "The reference study failed: " + error);
            return JsonDocument.Parse(File.ReadAllBytes(trace));
        }
        finally
        {
            File.Delete(trace);
        }
    }

    /// <summary>The plan that the trace was made from.</summary>
    public static Plan Plan(string caseName) => PlanFolders.Read(PlanFolders.Case(caseName)).Plan!;

    private static (int ExitCode, string Error) Run(params string[] arguments)
    {
        using var process = Process.Start(new ProcessStartInfo(Python, arguments)
        {
            RedirectStandardOutput = true,
            RedirectStandardError = true,
        })!;
        var output = process.StandardOutput.ReadToEndAsync(TestContext.Current.CancellationToken);
        var error = process.StandardError.ReadToEnd();
        process.WaitForExit();
        _ = output.GetAwaiter().GetResult();
        return (process.ExitCode, error);
    }
}
