using Halfvoice.Plans;

namespace Halfvoice.Rehearsal;

/// <summary>Finds sites whose load is more than their own plants and the limits of their border lines can bring in.</summary>
public static class BorderCheck
{
    /// <summary>Sites and the MW that they are short of in their worst cycle.</summary>
    public static IReadOnlyList<(string Site, double ShortMw)> Shortfalls(Plan plan)
    {
        var network = plan.Network;
        var found = new List<(string, double)>();
        foreach (var site in network.Sites)
        {
            var own = network.BusesOf(site);
            var inside = own.ToHashSet();
            var border = own.SelectMany(network.LinesAt).Distinct()
                .Where(l => !inside.Contains(network.Lines[l].FromBus) || !inside.Contains(network.Lines[l].ToBus))
                .Sum(l => network.Lines[l].LimitMw);
            var plants = own.SelectMany(network.GeneratorsAt).Sum(g => network.Generators[g].MaxMw);
            var worst = Enumerable.Range(1, Math.Max(1, plan.Loads[site].Count)).Max(c => plan.Loads[site].At(c).Sum());
            if (worst - plants - border > 1e-9)
                found.Add((site, worst - plants - border));
        }

        return found;
    }
}
