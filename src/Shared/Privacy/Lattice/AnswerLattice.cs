using System.Numerics;

namespace Halfvoice.Privacy;

/// <summary>
/// The lattice on which answers leave a site: value = steps · 2^exponent. Rounding is half-up, exactly; the argument for
/// the integer sensitivity is in <c>lattice.proof.md</c>. No message of this type ever quotes a value.
/// </summary>
public readonly record struct AnswerLattice
{
    /// <summary>Answers stay within ± this many steps; public and the same for every site, and exact as a double.</summary>
    public const long MaxSteps = 1L << 52;

    /// <summary>Least and greatest exponent.</summary>
    public const int MinExponent = -400, MaxExponent = 400;

    /// <summary>Steps that one noise scale is divided into where the bound leaves room: 2⁴⁰.</summary>
    private const int BitsPerScale = 40;

    /// <summary>Room for noise beyond the bound, in noise scales: it is used up with probability e⁻⁶⁴.</summary>
    private const double MarginInScales = 64;

    /// <param name="exponent">−400 to 400.</param>
    public AnswerLattice(int exponent)
    {
        ArgumentOutOfRangeException.ThrowIfLessThan(exponent, MinExponent);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(exponent, MaxExponent);
        Exponent = exponent;
    }

    /// <summary>For answers in MW without noise: about 1e-9 MW.</summary>
    public static AnswerLattice NoiselessMw => new(-30);

    /// <summary>For answers in rad without noise: about 1.4e-14 rad, finer than any tolerance in use and still ±64 rad wide.</summary>
    public static AnswerLattice NoiselessRad => new(-46);

    public int Exponent { get; }

    /// <summary>One step in the answer's unit, 2^exponent.</summary>
    public double Step => Math.ScaleB(1, Exponent);

    /// <summary>
    /// The lattice for a noise scale: one scale is 2⁴⁰ to 2⁴¹ steps, or fewer where bound and noise together would
    /// otherwise pass 2⁵² steps. Depends on public figures only.
    /// </summary>
    /// <param name="scaleInUnits">Noise scale in the answer's unit, above 0, finite.</param>
    /// <param name="bound">Public bound on the magnitude of an answer in its unit, at least 0, finite.</param>
    public static AnswerLattice For(double scaleInUnits, double bound)
    {
        if (!(scaleInUnits > 0) || !double.IsFinite(scaleInUnits))
            throw new ArgumentOutOfRangeException(nameof(scaleInUnits), "A noise scale is above 0 and finite.");
        if (!(bound >= 0) || !double.IsFinite(bound))
            throw new ArgumentOutOfRangeException(nameof(bound), "A bound is at least 0 and finite.");
        var exponent = Math.ILogB(scaleInUnits) - BitsPerScale;
        while (Math.ScaleB(bound + MarginInScales * scaleInUnits, -exponent) >= MaxSteps)
            exponent++;
        return new AnswerLattice(exponent);
    }

    /// <summary>Clamps a value to public bounds and rounds it half-up to the lattice, exactly.</summary>
    /// <param name="value">Finite, in the answer's unit. Private: it is not quoted by any error.</param>
    /// <param name="lowBound">Public, within ±2⁵² steps.</param>
    /// <param name="highBound">Public, at least <paramref name="lowBound"/>.</param>
    /// <exception cref="ArgumentException">The value is not a finite number.</exception>
    public long Quantize(double value, double lowBound, double highBound)
    {
        if (!double.IsFinite(value))
            throw new ArgumentException("An answer must be a finite number; the site problem did not give one.", nameof(value));
        if (!(lowBound <= highBound) || !Fits(lowBound) || !Fits(highBound))
            throw new ArgumentOutOfRangeException(nameof(highBound), "Bounds must be ordered and within the lattice's range.");
        var scaled = Math.ScaleB(Math.Clamp(value, lowBound, highBound), -Exponent);

        // ⌊v⌋, and one more where the fraction reaches ½. Not ⌊v + ½⌋: that sum rounds, and 0.49999999999999994 would become 1.
        var floor = Math.Floor(scaled);
        return (long)floor + (scaled - floor >= 0.5 ? 1 : 0);
    }

    /// <summary>Cuts an answer to ±2⁵² steps after noise was added: post-processing by a public rule.</summary>
    public static long Saturate(long steps) => Math.Clamp(steps, -MaxSteps, MaxSteps);

    /// <summary>The value of an answer, exactly, for magnitudes up to 2⁵³ steps.</summary>
    public double ToValue(long steps) => Math.ScaleB((double)steps, Exponent);

    /// <summary>Whether a number of steps may be on the wire.</summary>
    public static bool IsWithinRange(long steps) => steps is >= -MaxSteps and <= MaxSteps;

    /// <summary>
    /// How many steps an answer vector of this dimension can move in L1 when its real value moves by at most
    /// <paramref name="sensitivity"/> in L1: ⌈Δ/2^exponent⌉ + dimension − 1.
    /// </summary>
    /// <param name="sensitivity">Δ in the answer's unit, at least 0.</param>
    /// <param name="dimension">At least 1.</param>
    public BigInteger IntegerSensitivity(ExactFraction sensitivity, int dimension)
    {
        if (sensitivity < 0)
            throw new ArgumentOutOfRangeException(nameof(sensitivity), "A sensitivity is at least 0.");
        ArgumentOutOfRangeException.ThrowIfLessThan(dimension, 1);
        return (sensitivity / ExactFraction.PowerOfTwo(Exponent)).Ceiling() + dimension - 1;
    }

    private bool Fits(double bound) => Math.Abs(Math.ScaleB(bound, -Exponent)) <= MaxSteps;
}
