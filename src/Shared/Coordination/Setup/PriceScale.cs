using Halfvoice.Grid;

namespace Halfvoice.Coordination;

/// <summary>
/// The public price scale L: the lowest marginal cost at maximum output that covers 90 % of the adjustable capacity,
/// $/MWh. The penalty rule ρ_b = L / R_b rests on it. It says one price about all plants together; a plan may state
/// another public figure instead.
/// </summary>
public static class PriceScale
{
    /// <summary>Ranges at or below this count as fixed, MW.</summary>
    public const double TinyMw = 1e-6;

    private const double Quantile = 0.9;
    private const double LeastPerMwh = 1e-3;

    /// <returns>L, at least 0.001 $/MWh.</returns>
    public static double Of(IReadOnlyList<Generator> generators)
    {
        var adjustable = generators.Where(g => g.RangeMw > TinyMw)
            .Select(g => (Marginal: g.MarginalCost(g.MaxMw), g.RangeMw))
            .OrderBy(pair => pair.Marginal)
            .ToArray();
        var total = adjustable.Sum(pair => pair.RangeMw);
        var covered = 0.0;
        foreach (var (marginal, range) in adjustable)
        {
            covered += range;
            if (covered / total >= Quantile)
                return Math.Max(marginal, LeastPerMwh);
        }

        return LeastPerMwh;
    }
}
