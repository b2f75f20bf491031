namespace Halfvoice.Optimization;

/// <summary>The site problem of scheme <c>injection</c> at one bus.</summary>
public static class InjectionProblem
{
    /// <summary>
    /// The net injection x = P − load (MW) that minimises c(P) + u·x + ρ/2 · (x − z)² within the generators' limits.
    /// Completing the square, u·x + ρ/2·(x − z)² = ρ/2·(P − (z − u/ρ + load))² + constant, so the answer is the supply
    /// curve's response to that target, less the load. Exact; allocates nothing.
    /// </summary>
    /// <param name="supply">The generators of the bus.</param>
    /// <param name="consensusMw">z, MW.</param>
    /// <param name="dualPricePerMwh">u, $/MWh.</param>
    /// <param name="penalty">ρ, $/MW²h, more than 0.</param>
    /// <param name="loadMw">The load of the bus, MW; may be negative.</param>
    /// <exception cref="ArgumentOutOfRangeException">The penalty is not positive or an argument is not a number.</exception>
    public static double Solve(SupplyCurve supply, double consensusMw, double dualPricePerMwh, double penalty, double loadMw) =>
        supply.Respond(consensusMw - (dualPricePerMwh / penalty) + loadMw, penalty) - loadMw;
}
