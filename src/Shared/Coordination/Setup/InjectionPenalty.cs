using Halfvoice.Grid;

namespace Halfvoice.Coordination;

/// <summary>
/// The automatic penalty of scheme injection, from public plant data only and never adapted: ρ_b = L / R_b, with R_b the
/// range of the generators at bus b (MW) and L the public price scale ($/MWh).
/// </summary>
public static class InjectionPenalty
{
    /// <param name="factor">Multiplies the automatic value; 1 is the rule itself.</param>
    /// <returns>ρ by bus, $/MW²h; 0 where the bus has no range.</returns>
    public static double[] Of(Network network, double priceScalePerMwh, double factor)
    {
        var penalty = new double[network.Buses.Count];
        for (var bus = 0; bus < penalty.Length; bus++)
        {
            var rangeMw = network.GeneratorsAt(bus).Sum(g => network.Generators[g].RangeMw);
            penalty[bus] = rangeMw > PriceScale.TinyMw ? factor * priceScalePerMwh / rangeMw : 0;
        }

        return penalty;
    }
}
