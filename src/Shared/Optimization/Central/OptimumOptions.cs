namespace Halfvoice.Optimization;

/// <summary>Limits and tolerances of the interior-point method.</summary>
public sealed record OptimumOptions
{
    /// <summary>Iterations before the direct attempt counts as failed; default 100, at least 1.</summary>
    public int MaxIterations { get; init; } = 100;

    /// <summary>Relative tolerance on both residuals and on the gap; default 1e-10, 1e-12 to 1e-4.</summary>
    public double Tolerance { get; init; } = 1e-10;

    /// <summary>
    /// Unserved power up to this many MW per MW of total |load| (and never less than per 1 MW) is put down to rounding;
    /// more makes the problem infeasible. Default 1e-7.
    /// </summary>
    public double UnservedTolerance { get; init; } = 1e-7;

    internal void Check()
    {
        if (MaxIterations < 1)
            throw new ArgumentOutOfRangeException(nameof(MaxIterations), MaxIterations, "At least one iteration is needed.");
        if (!(Tolerance is >= 1e-12 and <= 1e-4))
            throw new ArgumentOutOfRangeException(nameof(Tolerance), Tolerance, "The tolerance must lie between 1e-12 and 1e-4.");
        if (!(UnservedTolerance is > 0 and < 1))
            throw new ArgumentOutOfRangeException(nameof(UnservedTolerance), UnservedTolerance, "Must lie between 0 and 1.");
    }
}
