namespace Halfvoice.Privacy;

/// <summary>
/// Public bounds on each coordinate of an answer, in its unit. They come from the plan, never from a site's loads:
/// values are clamped to them before rounding, so a bound that followed the data would leak it.
/// </summary>
public sealed class AnswerBounds
{
    private readonly double[] _low;
    private readonly double[] _high;

    /// <param name="low">One finite bound a coordinate; at least one coordinate.</param>
    /// <param name="high">Of the same length, each at least its low bound, finite.</param>
    public AnswerBounds(IReadOnlyList<double> low, IReadOnlyList<double> high)
    {
        ArgumentNullException.ThrowIfNull(low);
        ArgumentNullException.ThrowIfNull(high);
        if (low.Count == 0 || low.Count != high.Count)
            throw new ArgumentException("Low and high bounds must be of one length, at least 1.", nameof(high));
        for (var i = 0; i < low.Count; i++)
        {
            if (!double.IsFinite(low[i]) || !double.IsFinite(high[i]) || low[i] > high[i])
                throw new ArgumentException($"The bounds of coordinate {i} must be finite and ordered.", nameof(high));
        }

        _low = [.. low];
        _high = [.. high];
    }

    /// <summary>Bounds ±magnitude on every coordinate.</summary>
    public static AnswerBounds Symmetric(int dimension, double magnitude) =>
        new([.. Enumerable.Repeat(-magnitude, dimension)], [.. Enumerable.Repeat(magnitude, dimension)]);

    public int Dimension => _low.Length;

    /// <summary>The largest magnitude that any coordinate may take.</summary>
    public double Magnitude => Math.Max(_low.Max(Math.Abs), _high.Max(Math.Abs));

    internal void Quantize(AnswerLattice lattice, ReadOnlySpan<double> values, Span<long> steps)
    {
        if (values.Length != Dimension || steps.Length != Dimension)
            throw new ArgumentException($"An answer of this site has {Dimension} coordinates.");
        for (var i = 0; i < values.Length; i++)
            steps[i] = lattice.Quantize(values[i], _low[i], _high[i]);
    }
}
