using System.Diagnostics;
using Halfvoice.Rig.Processes;

namespace Halfvoice.Rig.Binaries;

/// <summary>Runs <c>dotnet publish</c> for one project and tells how it goes.</summary>
/// <param name="searchPath">The PATH to run with; also where the dotnet command is looked for.</param>
/// <param name="within">How long it may take.</param>
/// <param name="progress">Takes a line at the start, at the end, and every few seconds between.</param>
public sealed class DotnetPublish(string searchPath, TimeSpan within, Action<string> progress)
{
    private static readonly TimeSpan _tellEvery = TimeSpan.FromSeconds(5);

    // Set by a dotnet command that we may run under, and meant for it alone.
    private static readonly string[] _inherited =
        ["MSBuildSDKsPath", "MSBuildExtensionsPath", "MSBUILD_EXE_PATH", "MSBuildLoadMicrosoftTargetsReadOnly", "MSBUILDUSESERVER"];

    /// <summary>Publishes a project in its release configuration.</summary>
    /// <param name="project">The project's folder; its name names the logs.</param>
    /// <param name="artifacts">Folder for all results, and for the logs.</param>
    /// <param name="arguments">Further arguments.</param>
    /// <param name="what">What is being done, for the progress lines.</param>
    /// <param name="cancel">Ends the build.</param>
    /// <returns>What went wrong, as a sentence; null when the build succeeded.</returns>
    public async Task<string?> RunAsync(
        string project, string artifacts, IReadOnlyList<string> arguments, string what, CancellationToken cancel = default)
    {
        var dotnet = Environment.GetEnvironmentVariable("DOTNET_HOST_PATH") ?? Toolchain.FindCommand("dotnet", searchPath);
        if (dotnet is null)
            return "the dotnet command was not found. Install the .NET SDK that global.json names.";
        var name = Path.GetFileName(project);
        var logPath = Path.Combine(artifacts, $"{name}.build.log");
        var output = new List<string>();
        // No build server may stay behind: the rig leaves no process when it ends.
        var child = ChildProcess.Start(new ChildStart(
            $"build of {name}",
            dotnet,
            ["publish", project, "-c", "Release", "--artifacts-path", artifacts, .. arguments,
                "--nologo", "-nodeReuse:false", "-p:UseSharedCompilation=false", "-p:RunAnalyzers=false"])
        {
            WorkingFolder = project,
            Environment = BuildEnvironment(),
            ErrorLogPath = Path.Combine(artifacts, $"{name}.build.errors.log"),
            OnLine = output.Add,
        });
        var failure = await WaitAsync(child, what, cancel).ConfigureAwait(false);
        await File.WriteAllLinesAsync(logPath, output, cancel).ConfigureAwait(false);
        if (failure is not null)
            return failure;
        var exit = await child.Exited.ConfigureAwait(false);
        if (exit.ExitCode == 0)
            return null;
        var firstError = output.Concat(exit.LastErrorLines)
            .FirstOrDefault(line => line.Contains("error", StringComparison.OrdinalIgnoreCase));
        return $"{firstError?.Trim() ?? $"dotnet publish ended with exit code {exit.ExitCode}"} (all of it is in '{logPath}')";
    }

    private Dictionary<string, string?> BuildEnvironment()
    {
        var variables = _inherited.ToDictionary(name => name, _ => (string?)null);
        variables["PATH"] = searchPath;
        variables["DOTNET_NOLOGO"] = "1";
        variables["DOTNET_CLI_TELEMETRY_OPTOUT"] = "1";
        variables["DOTNET_CLI_UI_LANGUAGE"] = "en";
        variables["MSBUILDTERMINALLOGGER"] = "off";
        variables["MSBUILDDISABLENODEREUSE"] = "1";
        variables["DOTNET_CLI_USE_MSBUILD_SERVER"] = "0";
        return variables;
    }

    /// <summary>Waits for a build and tells every few seconds that it still runs; ends it when it takes too long.</summary>
    private async Task<string?> WaitAsync(ChildProcess child, string what, CancellationToken cancel)
    {
        var clock = Stopwatch.StartNew();
        progress($"{what} ...");
        try
        {
            while (await Task.WhenAny(child.Exited, Task.Delay(_tellEvery, cancel)).ConfigureAwait(false) != child.Exited)
            {
                cancel.ThrowIfCancellationRequested();
                progress($"{what} ... {clock.Elapsed.TotalSeconds:0} s");
                if (clock.Elapsed > within)
                    return $"it took more than {within.TotalMinutes:0} minutes.";
            }

            progress($"{what}: {clock.Elapsed.TotalSeconds:0} s");
            return null;
        }
        finally
        {
            if (!child.Exited.IsCompleted)
                child.KillTree();
            await child.Exited.ConfigureAwait(false);
        }
    }
}
