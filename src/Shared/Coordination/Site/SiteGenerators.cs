using Halfvoice.Grid;

namespace Halfvoice.Coordination;

/// <summary>A setup's plants as the solvers want them.</summary>
internal static class SiteGenerators
{
    /// <summary>Indices of the generators at each own bus.</summary>
    public static int[][] ByBus(SiteSetup setup) => Enumerable.Range(0, setup.Buses.Count)
        .Select(bus => Enumerable.Range(0, setup.Generators.Count).Where(g => setup.Generators[g].Bus == bus).ToArray())
        .ToArray();

    public static Generator[] Of(SiteSetup setup, IEnumerable<int> generators) => generators
        .Select(g => setup.Generators[g])
        .Select(g => new Generator(g.Name, g.Bus, g.MinMw, g.MaxMw, g.CostQuadratic, g.CostLinear, g.CostFixed))
        .ToArray();
}
