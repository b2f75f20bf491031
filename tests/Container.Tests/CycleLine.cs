using System.Text.Json;

namespace Halfvoice.Containers;

/// <summary>What the coordinator says on its standard output when a cycle is over.</summary>
/// <param name="Cycle">Number of the cycle, from 1.</param>
/// <param name="Settled">Whether mismatch and price move came under the plan's limits.</param>
internal sealed record CycleLine(int Cycle, bool Settled)
{
    /// <summary>The cycle lines among the coordinator's output, in order; every line must be one JSON object.</summary>
    public static IReadOnlyList<CycleLine> Read(string output)
    {
        var cycles = new List<CycleLine>();
        foreach (var line in output.Split('\n', StringSplitOptions.RemoveEmptyEntries))
        {
            using var json = JsonDocument.Parse(line);
            if (json.RootElement.TryGetProperty("event", out var kind) && kind.GetString() == "cycle")
            {
                var settled = json.RootElement.GetProperty("settled").GetBoolean();
                cycles.Add(new CycleLine(json.RootElement.GetProperty("cycle").GetInt32(), settled));
            }
        }

        return cycles;
    }
}
