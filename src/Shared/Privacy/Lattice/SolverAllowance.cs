namespace Halfvoice.Privacy;

/// <summary>
/// What a sensitivity is widened by because a site solves its problem in floating point. The theorem bounds how far the
/// exact answer moves; the computed one may be off on both sides, so the L1 distance of two computed answers is at most
/// Δ(1 + 2⁻³⁰) + 2 · dimension · 2⁻³⁶ · bound, provided that the solver errs by at most 2⁻³⁶ (1.5e-11) of the bound in a
/// coordinate. The solvers' own tests hold them to that. The relative part covers the rounding of Δ itself.
/// </summary>
public static class SolverAllowance
{
    /// <summary>Largest error of a computed coordinate, as a fraction of the public bound on answers.</summary>
    public static readonly double ErrorFraction = Math.ScaleB(1, -36);

    private const int RelativeExponent = -30;

    /// <summary>Δ widened for floating-point error, exactly.</summary>
    /// <param name="sensitivity">Δ in the answer's unit, at least 0, finite.</param>
    /// <param name="dimension">Coordinates of the answer, at least 1.</param>
    /// <param name="bound">Public bound on the magnitude of a coordinate, at least 0, finite.</param>
    public static ExactFraction Widen(double sensitivity, int dimension, double bound)
    {
        ArgumentOutOfRangeException.ThrowIfNegative(sensitivity);
        ArgumentOutOfRangeException.ThrowIfLessThan(dimension, 1);
        ArgumentOutOfRangeException.ThrowIfNegative(bound);
        var relative = ExactFraction.FromDouble(sensitivity) * (ExactFraction.PowerOfTwo(RelativeExponent) + 1);
        return relative + ExactFraction.FromDouble(bound) * ExactFraction.FromDouble(ErrorFraction) * (2L * dimension);
    }
}
