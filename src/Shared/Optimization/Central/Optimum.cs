namespace Halfvoice.Optimization;

/// <summary>The central optimum of a network and a load, or why there is none.</summary>
public sealed record Optimum
{
    public required OptimumStatus Status { get; init; }

    /// <summary>Σ a·p² + b·p + c over all generators, $/h; not a number when infeasible.</summary>
    public required double CostPerHour { get; init; }

    /// <summary>By generator, MW. When infeasible: a dispatch that leaves the least power unserved.</summary>
    public required double[] DispatchMw { get; init; }

    /// <summary>By bus: what one more MW of load there costs, $/MWh; zeros when infeasible.</summary>
    public required double[] PricePerMwh { get; init; }

    /// <summary>By line, MW, positive from the from-bus to the to-bus.</summary>
    public required double[] FlowMw { get; init; }

    /// <summary>By line: what one more MW of its limit would save, $/MWh, at least 0; zeros when infeasible.</summary>
    public required double[] LinePricePerMwh { get; init; }

    /// <summary>By bus, 0 at the first bus of every island.</summary>
    public required double[] AngleRad { get; init; }

    /// <summary>Interior-point iterations, all attempts together.</summary>
    public required int Iterations { get; init; }

    /// <summary>Largest difference at a bus between generation, load and flows, MW (unserved power counts as served).</summary>
    public required double MaxImbalanceMw { get; init; }

    /// <summary>Largest excess of a flow over its limit, MW; 0 when none.</summary>
    public required double MaxOverloadMw { get; init; }

    /// <summary>Largest violation of the price conditions, $/MWh.</summary>
    public required double DualResidualPerMwh { get; init; }

    /// <summary>(cost − lower bound from the prices) / (1 + |cost|).</summary>
    public required double RelativeGap { get; init; }

    /// <summary>Present when infeasible.</summary>
    public Infeasibility? Infeasibility { get; init; }
}
