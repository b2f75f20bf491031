namespace Halfvoice.Optimization;

/// <summary>How an attempt at the central optimum ended.</summary>
public enum OptimumStatus
{
    /// <summary>Optimal within the tolerances.</summary>
    Optimal,

    /// <summary>No dispatch serves these loads within the limits; the explanation is in <see cref="Optimum.Infeasibility"/>.</summary>
    Infeasible,

    /// <summary>The tolerances were not reached; the numbers are for diagnosis only.</summary>
    NotConverged,
}
