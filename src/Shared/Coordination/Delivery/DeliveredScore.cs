namespace Halfvoice.Coordination;

/// <summary>A line that carries more than its limit.</summary>
public sealed record Overload(int Line, double FlowMw, double LimitMw);

/// <summary>What a dispatch is worth once it is delivered.</summary>
public sealed record DeliveredScore
{
    /// <summary>Outputs by generator after balancing, MW.</summary>
    public required double[] OutputMw { get; init; }

    /// <summary>Flows by line, MW.</summary>
    public required double[] FlowMw { get; init; }

    public required double CostPerHour { get; init; }

    /// <summary>Delivered cost over optimum, less 1, as a fraction.</summary>
    public required double CostGap { get; init; }

    /// <summary>Imbalance that the generators took by participation, MW.</summary>
    public required double ReserveMw { get; init; }

    /// <summary>Imbalance that no headroom was left for, MW.</summary>
    public required double UnbalancedMw { get; init; }

    /// <summary>Largest |flow| / limit.</summary>
    public required double WorstLoading { get; init; }

    /// <summary>The line of <see cref="WorstLoading"/>; null where no line has a limit.</summary>
    public int? WorstLine { get; init; }

    public required IReadOnlyList<Overload> Overloads { get; init; }
}
