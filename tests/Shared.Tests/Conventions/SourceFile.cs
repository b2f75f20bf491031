namespace Halfvoice.Tests.Conventions;

/// <summary>A text of the source tree.</summary>
/// <param name="Path">Relative to the top of the repository, with forward slashes.</param>
internal sealed record SourceFile(string Path, string Text)
{
    public bool IsTest => Path.StartsWith("tests/", StringComparison.Ordinal);

    public string[] Lines() => Text.TrimEnd('\n').Split('\n');
}
