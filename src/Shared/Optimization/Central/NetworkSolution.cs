namespace Halfvoice.Optimization;

/// <summary>Answer of a <see cref="NetworkProgram"/>, with residuals measured on the unscaled problem.</summary>
public sealed record NetworkSolution
{
    /// <summary>False when the tolerances were missed; the rest then shows the best point met, for diagnosis only.</summary>
    public required bool Converged { get; init; }

    /// <summary>Σ price·s + slope/2·s², $/h.</summary>
    public required double CostPerHour { get; init; }

    /// <summary>By block, MW, within its limits.</summary>
    public required double[] BlockMw { get; init; }

    /// <summary>By bus: what one more MW of demand there costs, $/MWh.</summary>
    public required double[] PricePerMwh { get; init; }

    /// <summary>By line, MW, positive from the from-bus to the to-bus.</summary>
    public required double[] FlowMw { get; init; }

    /// <summary>By line: what one more MW of its limit would save, $/MWh, at least 0.</summary>
    public required double[] LinePricePerMwh { get; init; }

    /// <summary>By bus, 0 at the first bus of every island.</summary>
    public required double[] AngleRad { get; init; }

    /// <summary>Interior-point iterations.</summary>
    public required int Iterations { get; init; }

    /// <summary>Largest difference at a bus between what comes in and what goes out, MW.</summary>
    public required double MaxImbalanceMw { get; init; }

    /// <summary>Largest excess of a flow over its limit, MW; 0 when none.</summary>
    public required double MaxOverloadMw { get; init; }

    /// <summary>Largest violation of the price conditions Bλ + Aᵀ b y = 0, divided by the bus's susceptances, $/MWh.</summary>
    public required double DualResidualPerMwh { get; init; }

    /// <summary>(cost − lower bound from the prices) / (1 + |cost|).</summary>
    public required double RelativeGap { get; init; }

    /// <summary>By bus, elastic problems only: load left out, MW; otherwise empty.</summary>
    public double[] ShedMw { get; init; } = [];

    /// <summary>By bus, elastic problems only: power thrown away, MW; otherwise empty.</summary>
    public double[] SpillMw { get; init; } = [];
}
