using System.Text.Json;
using Halfvoice.Grid;
using Halfvoice.Tests.Plans;

namespace Halfvoice.Tests.Optimization;

/// <summary>The published networks beside the repository with their published cost.</summary>
internal static class CentralCases
{
    /// <summary>Network, loads by bus (MW) and published cost ($/h); skips the calling test where the folder is missing.</summary>
    public static (Network Network, double[] LoadMw, double CostPerHour) Read(string name)
    {
        var folder = PlanFolders.Case(name);
        var plan = PlanFolders.Read(folder).Plan!;
        using var expected = JsonDocument.Parse(File.ReadAllText(Path.Combine(folder, "expected.json")));
        return (plan.Network, plan.LoadMw(1), expected.RootElement.GetProperty("cost_per_hour").GetDouble());
    }
}
