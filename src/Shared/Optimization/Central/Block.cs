namespace Halfvoice.Optimization;

/// <summary>
/// An amount of power s that can be put in at a bus: lower ≤ s ≤ upper at a cost of price · s + slope/2 · s². Generators, pieces
/// of a learned price curve, moves of a projection and unserved load are all written as blocks.
/// </summary>
/// <param name="Bus">Index of the bus.</param>
/// <param name="LowerMw">Least amount, MW; may be negative infinity.</param>
/// <param name="UpperMw">Largest amount, MW, at least <paramref name="LowerMw"/>; may be positive infinity.</param>
/// <param name="PricePerMwh">Marginal cost at s = 0, $/MWh.</param>
/// <param name="SlopePerMw2h">Rise of the marginal cost, $/MW²h, at least 0; positive if both limits are infinite.</param>
public readonly record struct Block(int Bus, double LowerMw, double UpperMw, double PricePerMwh, double SlopePerMw2h)
{
    /// <summary>Cost at an amount, $/h.</summary>
    public double CostPerHour(double amountMw) => (PricePerMwh + (0.5 * SlopePerMw2h * amountMw)) * amountMw;

    /// <summary>Marginal cost at an amount, $/MWh.</summary>
    public double MarginalCost(double amountMw) => PricePerMwh + (SlopePerMw2h * amountMw);
}
