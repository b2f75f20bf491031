namespace Halfvoice.Grid;

/// <summary>A plant with cost a·p² + b·p + c ($/h) for min ≤ p ≤ max (MW).</summary>
/// <param name="Name">Unique within the plan.</param>
/// <param name="Bus">Index into <see cref="Network.Buses"/>.</param>
/// <param name="MinMw">Least output; may be negative (a battery that charges).</param>
/// <param name="MaxMw">Largest output, at least <paramref name="MinMw"/>.</param>
/// <param name="CostQuadratic">a, $/MW²h, at least 0.</param>
/// <param name="CostLinear">b, $/MWh.</param>
/// <param name="CostFixed">c, $/h; counted whatever the output.</param>
public sealed record Generator(
    string Name,
    int Bus,
    double MinMw,
    double MaxMw,
    double CostQuadratic,
    double CostLinear,
    double CostFixed = 0)
{
    /// <summary>Range of outputs, MW.</summary>
    public double RangeMw => MaxMw - MinMw;

    /// <summary>Cost at an output, $/h.</summary>
    public double CostPerHour(double outputMw) => ((CostQuadratic * outputMw) + CostLinear) * outputMw + CostFixed;

    /// <summary>Marginal cost at an output, $/MWh.</summary>
    public double MarginalCost(double outputMw) => CostLinear + (2 * CostQuadratic * outputMw);
}
