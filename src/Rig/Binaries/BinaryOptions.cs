namespace Halfvoice.Rig.Binaries;

/// <summary>Where to look for the agent's and the coordinator's executables, and how to build them.</summary>
public sealed record BinaryOptions
{
    /// <summary>Folder that must hold both (<c>--binaries DIR</c>); null looks beside the rig and then builds from the source.</summary>
    public string? Folder { get; init; }

    /// <summary>Skips the ahead-of-time build although it could be made, where starting the run at once matters more.</summary>
    public bool JitOnly { get; init; }

    /// <summary>The rig's own folder: agents may lie in its <c>agents</c> folder, and a source checkout is looked for above it.</summary>
    public string RigFolder { get; init; } = AppContext.BaseDirectory;

    /// <summary>Where commands are looked for; a build runs with it as its PATH.</summary>
    public string SearchPath { get; init; } = Environment.GetEnvironmentVariable("PATH") ?? "";

    /// <summary>How long one build may take; default 15 minutes.</summary>
    public TimeSpan BuildWithin { get; init; } = TimeSpan.FromMinutes(15);
}
