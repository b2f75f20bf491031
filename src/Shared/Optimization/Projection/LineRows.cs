namespace Halfvoice.Optimization;

/// <summary>
/// Sensitivities of line flows to the free injections, computed when first asked for and kept.
/// For line l with h = B⁻¹ b_l (e_from − e_to) the flow is hᵀz. With weights w = 1/ρ, the row kept is
/// a = √w ∘ (h − Σ w h / Σ w): moving z by −w ∘ (h − mean) keeps every island in balance, and aᵀa' is how far such a
/// move along one line's row shifts the flow of another.
/// </summary>
internal sealed class LineRows
{
    // 32 million numbers (256 MB) at most; beyond that, rows of lines that are not held are dropped.
    private const int MostNumbers = 32_000_000;

    private readonly GridGraph _graph;
    private readonly SusceptanceSystem _system;
    private readonly int[] _freeBus;
    private readonly double[] _rootWeight;
    private readonly double[] _islandWeight;
    private readonly double[]?[] _rows;
    private readonly double[] _right;
    private readonly double[] _angle;
    private readonly int _mostRows;
    private int _kept;

    public LineRows(GridGraph graph, SusceptanceSystem system, int[] freeBus, double[] rootWeight, double[] islandWeight)
    {
        _graph = graph;
        _system = system;
        _freeBus = freeBus;
        _rootWeight = rootWeight;
        _islandWeight = islandWeight;
        _rows = new double[graph.LineCount][];
        _right = new double[graph.BusCount];
        _angle = new double[graph.BusCount];
        _mostRows = Math.Max(64, MostNumbers / Math.Max(1, freeBus.Length));
    }

    /// <summary>The row of a line, by free bus.</summary>
    /// <param name="held">Lines whose rows must stay.</param>
    public double[] Of(int line, ReadOnlySpan<int> held)
    {
        if (_rows[line] is { } known)
            return known;
        if (_kept >= _mostRows)
            DropAllBut(held);
        var row = Compute(line);
        _rows[line] = row;
        _kept++;
        return row;
    }

    /// <summary>The row of a line that is known to be kept.</summary>
    public double[] Known(int line) =>
        _rows[line] ?? throw new InvalidOperationException("A held line has lost its row.");

    private double[] Compute(int line)
    {
        var b = _graph.SusceptanceMwPerRad[line];
        _right[_graph.From[line]] = b;
        _right[_graph.To[line]] = -b;
        _system.Solve(_right, _angle);
        _right[_graph.From[line]] = 0;
        _right[_graph.To[line]] = 0;
        var island = _graph.IslandOf[_graph.From[line]];
        double mean = 0;
        for (var k = 0; k < _freeBus.Length; k++)
        {
            if (_graph.IslandOf[_freeBus[k]] == island)
                mean += _rootWeight[k] * _rootWeight[k] * _angle[_freeBus[k]];
        }

        mean = _islandWeight[island] > 0 ? mean / _islandWeight[island] : 0;
        var row = new double[_freeBus.Length];
        for (var k = 0; k < row.Length; k++)
        {
            if (_graph.IslandOf[_freeBus[k]] == island)
                row[k] = _rootWeight[k] * (_angle[_freeBus[k]] - mean);
        }

        return row;
    }

    private void DropAllBut(ReadOnlySpan<int> held)
    {
        _kept = 0;
        for (var l = 0; l < _rows.Length; l++)
        {
            if (_rows[l] is null)
                continue;
            if (held.Contains(l))
                _kept++;
            else
                _rows[l] = null;
        }
    }
}
