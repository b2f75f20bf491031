namespace Halfvoice.Privacy;

/// <summary>
/// Exact draws from the discrete Laplace distribution P(z) = (1 − a)/(1 + a) · a^|z| with a = e^(−1/scale), by integer
/// comparisons alone (Canonne, Kamath and Steinke 2020). No floating-point number takes part, so there is no rounding
/// whose pattern could tell answers apart. The argument is in <c>noise.proof.md</c>.
/// </summary>
public static class DiscreteLaplace
{
    /// <summary>Largest scale, in lattice steps.</summary>
    public const long MaxScale = 1L << 44;

    /// <summary>
    /// Largest geometric part. Beyond it, with probability e^(−262,144), the draw saturates at a value that the answer's
    /// own saturation cuts off in any case.
    /// </summary>
    private const long MaxGeometric = 1L << 18;

    /// <summary>Restarts after which the source counts as broken; each try succeeds with probability above 0.3.</summary>
    private const int MaxAttempts = 4096;

    /// <summary>Terms of e^(−γ) after which the source counts as broken; a sound one gets there with probability below 1/200!.</summary>
    private const int MaxTerms = 200;

    /// <summary>One draw, in steps; |z| is below 2⁶³.</summary>
    /// <param name="noise">Uniform integers.</param>
    /// <param name="scale">The scale in steps, 1 to 2⁴⁴.</param>
    public static long Draw(NoiseReader noise, long scale)
    {
        ArgumentNullException.ThrowIfNull(noise);
        ArgumentOutOfRangeException.ThrowIfLessThan(scale, 1);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(scale, MaxScale);
        for (var attempt = 0; attempt < MaxAttempts; attempt++)
        {
            // |z| = u + scale · v: the remainder u has weight e^(−u/scale), the quotient v has weight e^(−v).
            var remainder = noise.Below(scale);
            if (!BernoulliExp(noise, remainder, scale))
                continue;
            var quotient = 0L;
            while (quotient < MaxGeometric && BernoulliExp(noise, 1, 1))
                quotient++;
            var magnitude = remainder + scale * quotient;
            var negative = noise.Bit();

            // Zero must not be counted from both sides.
            if (!negative || magnitude != 0)
                return negative ? -magnitude : magnitude;
        }

        throw NoiseReader.StuckSource();
    }

    /// <summary>One draw with a reader of its own, which is wiped afterwards.</summary>
    public static long Draw(INoiseSource source, long scale)
    {
        using var noise = new NoiseReader(source, 64);
        return Draw(noise, scale);
    }

    /// <summary>
    /// True with probability e^(−γ), γ = numerator/denominator in [0, 1]. The first k coins of probability γ/1, γ/2, …
    /// all succeed with probability γ^k/k!, so the run's length is even with probability 1 − γ + γ²/2 − … = e^(−γ).
    /// </summary>
    private static bool BernoulliExp(NoiseReader noise, long numerator, long denominator)
    {
        for (var term = 1; term <= MaxTerms; term++)
        {
            // A coin of probability γ/term is a coin of probability 1/term and one of probability γ.
            if (noise.Below(term) != 0 || noise.Below(denominator) >= numerator)
                return (term & 1) == 1;
        }

        throw NoiseReader.StuckSource();
    }
}
