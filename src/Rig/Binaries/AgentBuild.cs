namespace Halfvoice.Rig.Binaries;

/// <summary>Builds agent and coordinator from a source checkout, unless a build of exactly this source is there already.</summary>
internal sealed class AgentBuild(SourceCheckout checkout, BinaryOptions options, Action<string> progress)
{
    private readonly DotnetPublish _publish = new(options.SearchPath, options.BuildWithin, progress);

    /// <summary>Builds ahead of time where that is possible; otherwise, or when it fails, for the JIT.</summary>
    /// <exception cref="BinariesException">Neither build succeeded.</exception>
    public async Task<AgentBinaries> RunAsync(CancellationToken cancel)
    {
        var lockPath = Path.Combine(checkout.Artifacts, "agents.lock");
        using var only = await BuildLock.TakeAsync(
            lockPath, options.BuildWithin, () => progress("Another process is building the agents; waiting for it."), cancel)
            .ConfigureAwait(false);
        var whyNot = options.JitOnly ? "It was asked for." : Toolchain.WhyNotNative(options.SearchPath);
        if (whyNot is null)
        {
            var native = new Flavour(
                "native", $"release_{Toolchain.RuntimeIdentifier}", "ahead of time", ["-r", Toolchain.RuntimeIdentifier]);
            var (binaries, failure) = await BuildAsync(native, "They were built ahead of time on this machine.", cancel)
                .ConfigureAwait(false);
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
            var failure = await _publish.RunAsync(
                Path.Combine(checkout.Folder, "src", project), folder, flavour.Arguments,
                $"Building {project.ToLowerInvariant()} {flavour.How}", cancel).ConfigureAwait(false);
            if (failure is not null)
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
        string PathOf(string project, string name) =>
            Path.Combine(folder, "publish", project, flavour.Output, AgentBinaries.FileNameOf(name));
        var agent = PathOf("Agent", AgentBinaries.AgentName);
        var coordinator = PathOf("Coordinator", AgentBinaries.CoordinatorName);
        return File.Exists(agent) && File.Exists(coordinator) ? AgentBinaries.Of(agent, coordinator, reason) : null;
    }

    /// <summary>One of the two ways to build.</summary>
    /// <param name="Folder">Folder under artifacts.</param>
    /// <param name="Output">Folder that the SDK names after configuration and runtime.</param>
    /// <param name="How">For the user.</param>
    /// <param name="Arguments">Of dotnet publish.</param>
    private sealed record Flavour(string Folder, string Output, string How, string[] Arguments);
}
