namespace Halfvoice.Tests.Conventions;

/// <summary>A text of the source tree.</summary>
/// <param name="Path">Relative to the top of the repository, with forward slashes.</param>
internal sealed record SourceFile(string Path, string Text)
{
    public bool IsTest => Path.StartsWith("tests/", StringComparison.Ordinal);

    /// <summary>Benchmarks lie among the tests and are none: one that samples memory does so at intervals.</summary>
    public bool IsBenchmark => Path.StartsWith("tests/Benchmarks/", StringComparison.Ordinal);

    public string[] Lines() => Text.TrimEnd('\n').Split('\n');
}
