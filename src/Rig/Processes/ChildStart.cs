namespace Halfvoice.Rig.Processes;

/// <summary>What to start and where its words go.</summary>
/// <param name="Name">Name in messages and reports, unique among the living children of a fleet.</param>
/// <param name="Executable">Path of the executable.</param>
/// <param name="Arguments">Arguments, passed as they are: no shell reads them.</param>
public sealed record ChildStart(string Name, string Executable, IReadOnlyList<string> Arguments)
{
    /// <summary>Variables added to our own environment; a null value removes one.</summary>
    public IReadOnlyDictionary<string, string?> Environment { get; init; } = new Dictionary<string, string?>();

    /// <summary>Working folder; ours when null.</summary>
    public string? WorkingFolder { get; init; }

    /// <summary>File that standard error is appended to; null keeps only its last lines in memory.</summary>
    public string? ErrorLogPath { get; init; }

    /// <summary>Standard error beyond this is thrown away, so that no child can fill the disk. Default 64 MiB, at least 0.</summary>
    public long ErrorLogLimitBytes { get; init; } = 64L << 20;

    /// <summary>
    /// Takes every line of standard output, in order, from one thread at a time; <see cref="ChildProcess.Lines"/> has them too.
    /// It should return at once: while it runs, the child may block on a full pipe.
    /// </summary>
    public Action<string>? OnLine { get; init; }

    /// <summary>
    /// Lines kept in <see cref="ChildProcess.Lines"/> for a reader that lags; older ones are dropped and counted.
    /// Default 1,024, at least 1.
    /// </summary>
    public int LineCapacity { get; init; } = 1024;
}
