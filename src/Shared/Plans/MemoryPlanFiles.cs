using System.Text;

namespace Halfvoice.Plans;

/// <summary>A plan folder held in memory: a plan just made, a bundle, a test.</summary>
public sealed class MemoryPlanFiles : IPlanFiles
{
    private readonly Dictionary<string, byte[]> _files;

    public MemoryPlanFiles(IEnumerable<KeyValuePair<string, byte[]>> files) =>
        _files = new Dictionary<string, byte[]>(files, StringComparer.Ordinal);

    public MemoryPlanFiles(IEnumerable<KeyValuePair<string, string>> texts)
        : this(texts.Select(pair => KeyValuePair.Create(pair.Key, Encoding.UTF8.GetBytes(pair.Value))))
    {
    }

    public PlanFileNames List() => new([.. _files.Keys]);

    public PlanFileContent Read(string name, int maxBytes)
    {
        if (!_files.TryGetValue(name, out var bytes))
            return new PlanFileContent(null, "is missing");
        return bytes.Length > maxBytes
            ? new PlanFileContent(null, PlanFileRules.TooLarge(bytes.Length, maxBytes))
            : new PlanFileContent(bytes);
    }
}
