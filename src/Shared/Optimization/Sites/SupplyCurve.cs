using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>
/// What all generators of one bus offer together: the inverse of their common marginal cost. The curve is kept as
/// vertices (MW, $/MWh) that never fall in either coordinate, so that every question about it is one binary search
/// and one interpolation: exact, without iteration and without allocation. Immutable.
/// </summary>
/// <remarks>
/// A generator with cost a·p² + b·p + c runs at clip((ν − b)/2a, min, max) at price ν; with a = 0 it jumps from
/// minimum to maximum at ν = b, which the curve shows as a level stretch. Between two neighbouring vertices every
/// generator's output is affine in the total, so a row of outputs at each vertex also answers how a total is shared.
/// </remarks>
public sealed class SupplyCurve
{
    private readonly int _generatorCount;
    private readonly double[] _vertexMw;
    private readonly double[] _vertexPrice;
    private readonly double[] _vertexOutputMw;

    /// <summary>Builds the curve of the generators given; none at all is allowed and supplies 0 MW at any price.</summary>
    /// <param name="generators">Finite limits with min ≤ max, finite costs with a ≥ 0. Their bus is not looked at.</param>
    /// <exception cref="ArgumentException">A limit or cost breaks the rules above.</exception>
    public SupplyCurve(IReadOnlyList<Generator> generators)
    {
        ArgumentNullException.ThrowIfNull(generators);
        foreach (var generator in generators)
            Check(generator);
        _generatorCount = generators.Count;
        var prices = new SortedSet<double>();
        foreach (var generator in generators.Where(generator => generator.RangeMw > 0))
        {
            prices.Add(generator.MarginalCost(generator.MinMw));
            prices.Add(generator.MarginalCost(generator.MaxMw));
        }

        if (prices.Count == 0)
            prices.Add(0);
        var vertices = new List<(double Mw, double Price, double[] OutputMw)>();
        foreach (var price in prices)
        {
            AddVertex(vertices, generators, price, tieHigh: false);
            AddVertex(vertices, generators, price, tieHigh: true);
        }

        _vertexMw = vertices.Select(vertex => vertex.Mw).ToArray();
        _vertexPrice = vertices.Select(vertex => vertex.Price).ToArray();
        _vertexOutputMw = vertices.SelectMany(vertex => vertex.OutputMw).ToArray();
    }

    /// <summary>Least total output, MW.</summary>
    public double MinMw => _vertexMw[0];

    /// <summary>Largest total output, MW.</summary>
    public double MaxMw => _vertexMw[^1];

    /// <summary>Range of the total output, MW; 0 when nothing can be decided.</summary>
    public double RangeMw => MaxMw - MinMw;

    /// <summary>Number of generators, the length that <see cref="Split"/> fills.</summary>
    public int GeneratorCount => _generatorCount;

    /// <summary>
    /// The total P (MW) that minimises c(P) + penalty/2 · (P − target)². Exact: with the vertices in order, the excess
    /// price − penalty · (target − P) never falls, and the piece on which it changes sign holds the answer.
    /// </summary>
    /// <param name="targetMw">Any number, MW.</param>
    /// <param name="penalty">$/MW²h, more than 0.</param>
    /// <exception cref="ArgumentOutOfRangeException">The target is not a number or the penalty not positive.</exception>
    public double Respond(double targetMw, double penalty)
    {
        if (double.IsNaN(targetMw))
            throw new ArgumentOutOfRangeException(nameof(targetMw), "A target must be a number of MW.");
        if (!(penalty > 0))
            throw new ArgumentOutOfRangeException(nameof(penalty), "A penalty must be more than 0 $/MW²h.");
        int low = 0, high = _vertexMw.Length;
        while (low < high)
        {
            var middle = (low + high) >> 1;
            if (_vertexPrice[middle] - (penalty * (targetMw - _vertexMw[middle])) >= 0)
                high = middle;
            else
                low = middle + 1;
        }

        if (low == 0)
            return _vertexMw[0];
        if (low == _vertexMw.Length)
            return _vertexMw[^1];
        var before = _vertexPrice[low - 1] - (penalty * (targetMw - _vertexMw[low - 1]));
        var after = _vertexPrice[low] - (penalty * (targetMw - _vertexMw[low]));
        var share = before / (before - after);
        return Math.Min(_vertexMw[low - 1] + (share * (_vertexMw[low] - _vertexMw[low - 1])), _vertexMw[low]);
    }

    /// <summary>
    /// Merit split of a total: every generator at the common marginal price; those whose linear cost ties at it share
    /// in proportion to their range. A total outside the range is taken as the nearest end.
    /// </summary>
    /// <param name="totalMw">MW.</param>
    /// <param name="outputMw">Receives one output per generator, in the order of construction.</param>
    /// <exception cref="ArgumentException">The span is not as long as there are generators, or the total is not a number.</exception>
    public void Split(double totalMw, Span<double> outputMw)
    {
        if (outputMw.Length != _generatorCount)
            throw new ArgumentException($"The split fills {_generatorCount} outputs, not {outputMw.Length}.", nameof(outputMw));
        if (double.IsNaN(totalMw))
            throw new ArgumentException("A total must be a number of MW.", nameof(totalMw));
        var after = FirstVertexAtLeast(_vertexMw, totalMw);
        var before = Math.Max(after - 1, 0);
        after = Math.Min(after, _vertexMw.Length - 1);
        var widthMw = _vertexMw[after] - _vertexMw[before];
        var share = widthMw > 0 ? (totalMw - _vertexMw[before]) / widthMw : 0;
        for (var g = 0; g < outputMw.Length; g++)
        {
            var from = _vertexOutputMw[(before * _generatorCount) + g];
            outputMw[g] = from + (share * (_vertexOutputMw[(after * _generatorCount) + g] - from));
        }
    }

    /// <summary>Total output (MW) at a price ($/MWh).</summary>
    /// <param name="price">$/MWh.</param>
    /// <param name="tieHigh">Whether generators with a linear cost exactly at the price run at their maximum.</param>
    public double Supply(double price, bool tieHigh)
    {
        var after = FirstVertexAtLeast(_vertexPrice, price);
        if (after == _vertexPrice.Length)
            return _vertexMw[^1];
        if (_vertexPrice[after] == price)
        {
            while (tieHigh && after + 1 < _vertexPrice.Length && _vertexPrice[after + 1] == price)
                after++;
            return _vertexMw[after];
        }

        if (after == 0)
            return _vertexMw[0];
        var share = (price - _vertexPrice[after - 1]) / (_vertexPrice[after] - _vertexPrice[after - 1]);
        return _vertexMw[after - 1] + (share * (_vertexMw[after] - _vertexMw[after - 1]));
    }

    /// <summary>
    /// The price ν ($/MWh) at which supply meets an affine need of intercept + slope · ν MW, slope ≤ 0. Beyond the
    /// outermost vertices supply is constant, so with slope 0 the answer may be an infinity of the right sign.
    /// </summary>
    internal double CrossingPrice(double interceptMw, double slope)
    {
        int low = 0, high = _vertexMw.Length;
        while (low < high)
        {
            var middle = (low + high) >> 1;
            if (ExcessMw(middle, interceptMw, slope) >= 0)
                high = middle;
            else
                low = middle + 1;
        }

        if (low == 0 || low == _vertexMw.Length)
        {
            var end = low == 0 ? 0 : low - 1;
            var excess = ExcessMw(end, interceptMw, slope);
            return excess == 0 ? _vertexPrice[end] : _vertexPrice[end] + (slope < 0 ? excess / slope : -excess * double.PositiveInfinity);
        }

        var before = ExcessMw(low - 1, interceptMw, slope);
        var share = before / (before - ExcessMw(low, interceptMw, slope));
        return _vertexPrice[low - 1] + (share * (_vertexPrice[low] - _vertexPrice[low - 1]));
    }

    private double ExcessMw(int vertex, double interceptMw, double slope) =>
        _vertexMw[vertex] - interceptMw - (slope * _vertexPrice[vertex]);

    private static int FirstVertexAtLeast(double[] values, double value)
    {
        int low = 0, high = values.Length;
        while (low < high)
        {
            var middle = (low + high) >> 1;
            if (values[middle] >= value)
                high = middle;
            else
                low = middle + 1;
        }

        return low;
    }

    private static void AddVertex(
        List<(double Mw, double Price, double[] OutputMw)> vertices, IReadOnlyList<Generator> generators, double price, bool tieHigh)
    {
        var outputMw = generators.Select(generator => OutputAt(generator, price, tieHigh)).ToArray();
        var totalMw = outputMw.Sum();
        if (vertices.Count == 0 || vertices[^1].Price != price || vertices[^1].Mw != totalMw)
            vertices.Add((totalMw, price, outputMw));
    }

    /// <summary>The ends are compared by price, not by output, so that a breakpoint gives its limit to the last bit.</summary>
    private static double OutputAt(Generator generator, double price, bool tieHigh)
    {
        var lowest = generator.MarginalCost(generator.MinMw);
        var highest = generator.MarginalCost(generator.MaxMw);
        if (price < lowest || (price == lowest && !(tieHigh && lowest == highest)))
            return generator.MinMw;
        if (price >= highest)
            return generator.MaxMw;
        return Math.Clamp((price - generator.CostLinear) / (2 * generator.CostQuadratic), generator.MinMw, generator.MaxMw);
    }

    private static void Check(Generator generator)
    {
        if (!double.IsFinite(generator.MinMw) || !double.IsFinite(generator.MaxMw) || generator.MinMw > generator.MaxMw)
            throw new ArgumentException($"Generator {generator.Name} needs finite limits with the minimum not above the maximum.");
        if (!double.IsFinite(generator.CostLinear) || !double.IsFinite(generator.CostQuadratic) || generator.CostQuadratic < 0)
            throw new ArgumentException($"Generator {generator.Name} needs finite costs with a quadratic part of at least 0.");
    }
}
