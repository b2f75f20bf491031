namespace Halfvoice.Privacy;

/// <summary>
/// Figures of the discrete Laplace distribution, for planning and for checking. They are floating-point values and never
/// take part in a draw. With a = e^(−1/scale): P(z) = (1 − a)/(1 + a) · a^|z|, variance 2a/(1 − a)²,
/// P(|Z| ≥ m) = 2a^m/(1 + a) for m ≥ 1 (Ghosh, Roughgarden and Sundararajan 2009, from memory).
/// </summary>
/// <param name="Scale">The scale, in steps, above 0.</param>
public readonly record struct DiscreteLaplaceLaw(double Scale)
{
    /// <summary>The probability of a value, in steps.</summary>
    public double Probability(long steps) => Math.Tanh(0.5 / Scale) * Math.Exp(-Math.Abs((double)steps) / Scale);

    /// <summary>The variance, in steps².</summary>
    public double Variance
    {
        get
        {
            // 2a/(1 − a)² = 1/(2 sinh²(1/(2·scale))), which does not cancel for large scales.
            var s = Math.Sinh(0.5 / Scale);
            return 0.5 / (s * s);
        }
    }

    /// <summary>The standard deviation, in steps.</summary>
    public double StandardDeviation => Math.Sqrt(Variance);

    /// <summary>P(|Z| ≥ magnitude).</summary>
    public double TailProbability(long magnitude) =>
        magnitude <= 0 ? 1 : 2 * Math.Exp(-magnitude / Scale) / (1 + Math.Exp(-1 / Scale));
}
