namespace Halfvoice.Optimization;

/// <summary>How a <see cref="DualActiveSet"/> solve ended.</summary>
public enum DualActiveSetStatus
{
    /// <summary>The point meets every row and is the minimum, to rounding.</summary>
    Optimal,

    /// <summary>No point meets every row.</summary>
    Infeasible,

    /// <summary>The bound on steps was reached, which only rounding can cause.</summary>
    StepLimit,
}
