using System.Diagnostics;
using Halfvoice.Rig.Processes;

namespace Halfvoice.Rig.Binaries;

/// <summary>Builds agent and coordinator from a source checkout, unless a build of exactly this source is there already.</summary>
internal sealed class AgentBuild(SourceCheckout checkout, BinaryOptions options, Action<string> progress)
{
    private static readonly TimeSpan _tellEvery = TimeSpan.FromSeconds(5);

    // Set by a dotnet command that we may run under, and meant for it alone.
    private static readonly string[] _inherited =
        ["MSBuildSDKsPath", "MSBuildExtensionsPath", "MSBUILD_EXE_PATH", "MSBuildLoadMicrosoftTargetsReadOnly", "MSBUILDUSESERVER"];

    /// <summary>Builds ahead of time where that is possible; otherwise, or when it fails, for the JIT.</summary>
    /// <exception cref="BinariesException">Neither build succeeded.</exception>
    public async Task<AgentBinaries> RunAsync(CancellationToken cancel)
    {
        var lockPath = Path.Combine(checkout.Artifacts, "agents.lock");
        using var only = await BuildLock.TakeAsync(
            lockPath, options.BuildWithin, () => progress("Another process is building the agents; waiting for it."), cancel).ConfigureAwait(false);
        var whyNot = options.JitOnly ? "It was asked for." : Toolchain.WhyNotNative(options.SearchPath);
        if (whyNot is null)
        {
            var native = new Flavour(
                "native", $"release_{Toolchain.RuntimeIdentifier}", "ahead of time", ["-r", Toolchain.RuntimeIdentifier]);
            var (binaries, failure) = await BuildAsync(native, "They were built ahead of time on this machine.", cancel).ConfigureAwait(false);
            if (binaries is not null)
                return binaries;
            whyNot = $"The ahead-of-time build failed: {failure}";
            progress(whyNot);
        }

        var jit = new Flavour("jit", "release", "for the JIT", ["-p:PublishAot=false", "--self-contained", "false"]);
        var (fallback, fatal) = await BuildAsync(jit, whyNot, cancel).ConfigureAwait(false);
        return fallback ?? throw new BinariesException($"Agent and coordinator cannot be built: {fatal}");
    }

    private async Task<(AgentBinaries? Binaries, string? Failure)> BuildAsync(Flavour flavour, string reason, CancellationToken cancel)
    {
        var folder = Path.Combine(checkout.Artifacts, flavour.Folder);
        var stampPath = Path.Combine(folder, "agents.stamp");
        var stamp = checkout.Stamp();
        if (File.Exists(stampPath) && await File.ReadAllTextAsync(stampPath, cancel).ConfigureAwait(false) == stamp
            && Find(folder, flavour, reason) is { } present)
        {
            return (present, null);
        }

        // A half-made build must not pass for the one that the old stamp stands for.
        Directory.CreateDirectory(folder);
        File.Delete(stampPath);
        foreach (var project in new[] { "Agent", "Coordinator" })
        {
            if (await PublishAsync(project, flavour, folder, cancel).ConfigureAwait(false) is { } failure)
                return (null, failure);
        }

        var built = Find(folder, flavour, reason);
        if (built is null)
            return (null, $"the build left no executables in '{folder}'.");
        await File.WriteAllTextAsync(stampPath, stamp, cancel).ConfigureAwait(false);
        return (built, null);
    }

    private static AgentBinaries? Find(string folder, Flavour flavour, string reason)
    {
        var agent = Path.Combine(folder, "publish", "Agent", flavour.Output, AgentBinaries.FileNameOf(AgentBinaries.AgentName));
        var coordinator = Path.Combine(folder, "publish", "Coordinator", flavour.Output, AgentBinaries.FileNameOf(AgentBinaries.CoordinatorName));
        return File.Exists(agent) && File.Exists(coordinator) ? AgentBinaries.Of(agent, coordinator, reason) : null;
    }

    /// <returns>What went wrong, or null.</returns>
    private async Task<string?> PublishAsync(string project, Flavour flavour, string folder, CancellationToken cancel)
    {
        var dotnet = Environment.GetEnvironmentVariable("DOTNET_HOST_PATH") ?? Toolchain.FindCommand("dotnet", options.SearchPath);
        if (dotnet is null)
            return "the dotnet command was not found. Install the .NET SDK that global.json names.";
        var logPath = Path.Combine(folder, $"{project}.build.log");
        var output = new List<string>();
        // No build server may stay behind: the rig leaves no process when it ends.
        var child = ChildProcess.Start(new ChildStart(
            $"build of {project}",
            dotnet,
            ["publish", Path.Combine(checkout.Folder, "src", project), "-c", "Release", "--artifacts-path", folder, .. flavour.Arguments,
                "--nologo", "-nodeReuse:false", "-p:UseSharedCompilation=false", "-p:RunAnalyzers=false"])
        {
            WorkingFolder = checkout.Folder,
            Environment = BuildEnvironment(),
            ErrorLogPath = Path.Combine(folder, $"{project}.build.errors.log"),
            OnLine = output.Add,
        });
        var failure = await WaitAsync(child, $"Building {project.ToLowerInvariant()} {flavour.How}", cancel).ConfigureAwait(false);
        await File.WriteAllLinesAsync(logPath, output, cancel).ConfigureAwait(false);
        if (failure is not null)
            return failure;
        var exit = await child.Exited.ConfigureAwait(false);
        if (exit.ExitCode == 0)
            return null;
        var firstError = output.Concat(exit.LastErrorLines).FirstOrDefault(line => line.Contains("error", StringComparison.OrdinalIgnoreCase));
        return $"{firstError?.Trim() ?? $"dotnet publish ended with exit code {exit.ExitCode}"} (all of it is in '{logPath}')";
    }

    private Dictionary<string, string?> BuildEnvironment()
    {
        var variables = _inherited.ToDictionary(name => name, _ => (string?)null);
        variables["PATH"] = options.SearchPath;
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
                if (clock.Elapsed > options.BuildWithin)
                    return $"it took more than {options.BuildWithin.TotalMinutes:0} minutes.";
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

    /// <summary>One of the two ways to build.</summary>
    /// <param name="Folder">Folder under artifacts.</param>
    /// <param name="Output">Folder that the SDK names after configuration and runtime.</param>
    /// <param name="How">For the user.</param>
    /// <param name="Arguments">Of dotnet publish.</param>
    private sealed record Flavour(string Folder, string Output, string How, string[] Arguments);
}
