namespace Halfvoice.Tests.Infrastructure;

/// <summary>A folder of a test's own, removed afterwards.</summary>
public sealed class TestFolder : IDisposable
{
    public string Path { get; } = Directory.CreateTempSubdirectory("halfvoice-").FullName;

    public string File(string name) => System.IO.Path.Combine(Path, name);

    public void Dispose() => Directory.Delete(Path, recursive: true);
}
