namespace Halfvoice.Privacy;

/// <summary>
/// Scheme <c>angle</c>: the most that all angles a site answers can move together, in L1 (rad), when its loads move by
/// <c>adjacency_mw</c> in L1, for every ask, cost, plant limit and flow limit. Proof: <c>angle.proof.md</c>.
/// </summary>
public static class AngleSensitivity
{
    /// <summary>Limited lines up to which a one-bus site's sets are all visited: a million sets, some milliseconds.</summary>
    public const int DefaultEnumeration = 20;

    /// <summary>Covers the rounding of a bound that was computed in floating point, see the proof.</summary>
    internal const double RoundingAllowance = 1 + 1e-6;

    /// <param name="shape">The site.</param>
    /// <param name="adjacencyMw">The load change that must stay hidden, L1, MW, above 0.</param>
    /// <param name="enumerateUpTo">
    /// Neighbours with a limit up to which a one-bus site's bound is exact, 0 to 24; each one more doubles the time.
    /// </param>
    /// <returns>The least of the bounds that apply, with its method.</returns>
    public static SensitivityBound For(AngleSiteShape shape, double adjacencyMw, int enumerateUpTo = DefaultEnumeration)
    {
        ArgumentNullException.ThrowIfNull(shape);
        ArgumentOutOfRangeException.ThrowIfNegative(enumerateUpTo);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(enumerateUpTo, 24);
        Adjacency.Check(adjacencyMw);
        var price = UnservedPriceOnly(shape, adjacencyMw);
        if (AngleBranch.Of(shape) is not { } branches)
            return price;
        var sets = shape.OwnBuses == 1
            ? OneBusAngleBound.For(shape, branches, adjacencyMw, enumerateUpTo)
            : AreaAngleBound.For(shape, branches, adjacencyMw);
        return SensitivityBound.Least(price, sets);
    }

    /// <summary>
    /// The bound that holds for a site of any size: ‖Δθ‖²_W ≤ Δν·Δd with every price ν between −V and V, so
    /// ‖Δθ‖₁ ≤ √(Σ 1/w) · √(2 V · adjacency). Proof: <c>angle.proof.md</c>, part 3.
    /// </summary>
    /// <param name="shape">The site.</param>
    /// <param name="adjacencyMw">The load change that must stay hidden, L1, MW, above 0.</param>
    public static SensitivityBound UnservedPriceOnly(AngleSiteShape shape, double adjacencyMw)
    {
        ArgumentNullException.ThrowIfNull(shape);
        Adjacency.Check(adjacencyMw);
        var spread = shape.CopyWeights.Where(weight => weight > 0).Sum(weight => 1 / weight);
        var l1 = Math.Sqrt(spread) * Math.Sqrt(2 * shape.UnservedPricePerMwh * adjacencyMw);
        return new SensitivityBound(l1 * RoundingAllowance, SensitivityMethod.UnservedPrice);
    }
}
