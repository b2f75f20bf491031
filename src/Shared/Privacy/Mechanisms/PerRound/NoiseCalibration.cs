using System.Numerics;

namespace Halfvoice.Privacy;

/// <summary>
/// Lattice, integer sensitivity and noise scale of one answer, from public figures alone. With s the sensitivity and T the
/// scale, both in whole steps, T = ⌈s/ε⌉, so the release is (s/T)-differentially private and s/T ≤ ε.
/// Argued in <c>per-round.proof.md</c>.
/// </summary>
public sealed record NoiseCalibration
{
    private NoiseCalibration(AnswerLattice lattice, long sensitivitySteps, long scaleSteps, int dimension, long epsilonUnitsEach)
    {
        Lattice = lattice;
        SensitivitySteps = sensitivitySteps;
        ScaleSteps = scaleSteps;
        Dimension = dimension;
        EpsilonUnitsEach = epsilonUnitsEach;
    }

    public AnswerLattice Lattice { get; }

    /// <summary>s: most that a rounded answer moves in L1 between adjacent loads, in steps.</summary>
    public long SensitivitySteps { get; }

    /// <summary>T: the scale of the discrete Laplace noise on each coordinate, in steps.</summary>
    public long ScaleSteps { get; }

    public int Dimension { get; }

    /// <summary>What an answer is charged, units of 1e-12; at least s/T.</summary>
    public long EpsilonUnitsEach { get; }

    /// <summary>The noise scale in the answer's unit.</summary>
    public double Scale => ScaleSteps * Lattice.Step;

    /// <summary>The standard deviation of a coordinate's noise in the answer's unit.</summary>
    public double StandardDeviation => new DiscreteLaplaceLaw(ScaleSteps).StandardDeviation * Lattice.Step;

    /// <summary>s/T, exactly: the ε that the proof claims for one answer.</summary>
    public ExactFraction ClaimedEpsilon => new(SensitivitySteps, ScaleSteps);

    /// <param name="sensitivity">The proven L1 bound, in the answer's unit.</param>
    /// <param name="bounds">Public bounds on the answer.</param>
    /// <param name="epsilonUnitsEach">ε of one answer, units of 1e-12, at least 1.</param>
    /// <exception cref="ArgumentException">Bounds and noise do not fit one lattice; says which figure to change.</exception>
    public static NoiseCalibration For(SensitivityBound sensitivity, AnswerBounds bounds, long epsilonUnitsEach)
    {
        ArgumentNullException.ThrowIfNull(sensitivity);
        ArgumentNullException.ThrowIfNull(bounds);
        ArgumentOutOfRangeException.ThrowIfLessThan(epsilonUnitsEach, 1);
        var widened = SolverAllowance.Widen(sensitivity.L1, bounds.Dimension, bounds.Magnitude);

        // The lattice needs the scale's order of magnitude only; an answer that cannot move still gets a lattice.
        var scale = Math.Max(sensitivity.L1, bounds.Magnitude * SolverAllowance.ErrorFraction) * EpsilonUnits.PerOne / epsilonUnitsEach;
        if (!(scale > 0) || !double.IsFinite(scale) || Math.Abs((double)Math.ILogB(scale)) > AnswerLattice.MaxExponent / 2)
        {
            throw new ArgumentException(
                "Sensitivity, bounds and ε give no usable noise scale; check privacy.adjacency_mw and privacy.epsilon.");
        }

        var lattice = AnswerLattice.For(scale, bounds.Magnitude);
        var steps = lattice.IntegerSensitivity(widened, bounds.Dimension);
        var scaleSteps = (new ExactFraction(steps, 1) / new ExactFraction(epsilonUnitsEach, EpsilonUnits.PerOne)).Ceiling();
        if (scaleSteps > DiscreteLaplace.MaxScale || scaleSteps < BigInteger.One)
        {
            throw new ArgumentException(
                "The noise scale does not fit the answer's lattice: raise privacy.epsilon, or let fewer answers share it.");
        }

        return new NoiseCalibration(lattice, (long)steps, (long)scaleSteps, bounds.Dimension, epsilonUnitsEach);
    }
}
