namespace Halfvoice.Optimization;

/// <summary>
/// Sensitivities of line flows to the free injections for the lines that have ever been over their limit.
/// For line l with h = B⁻¹ b_l (e_from − e_to) the flow is hᵀz. With weights w = 1/ρ, the row kept is
/// a = √w ∘ (h − Σ w h / Σ w): moving z by −w ∘ (h − mean) keeps every island in balance, and aᵀa' is how far such a
/// move along one line's row shifts the flow of another. All these products are kept as well.
/// </summary>
internal sealed class LineRows
{
    private const int NotKept = -1;

    // 32 million numbers (256 MB) of rows and 4 million products at most; beyond that, lines that are not held are dropped.
    private const int MostNumbers = 32_000_000;
    private const int MostLines = 2000;

    private readonly GridGraph _graph;
    private readonly SusceptanceSystem _system;
    private readonly int[] _freeBus;
    private readonly double[] _rootWeight;
    private readonly double[] _islandWeight;
    private readonly int[] _slot;
    private readonly double[] _right;
    private readonly double[] _angle;
    private readonly int _mostRows;
    private int[] _line = new int[16];
    private double[][] _row = new double[16][];
    private double[][] _products = new double[16][];

    public LineRows(GridGraph graph, SusceptanceSystem system, int[] freeBus, double[] rootWeight, double[] islandWeight)
    {
        _graph = graph;
        _system = system;
        _freeBus = freeBus;
        _rootWeight = rootWeight;
        _islandWeight = islandWeight;
        _slot = new int[graph.LineCount];
        Array.Fill(_slot, NotKept);
        _right = new double[graph.BusCount];
        _angle = new double[graph.BusCount];
        _mostRows = Math.Clamp(MostNumbers / Math.Max(1, freeBus.Length), 64, MostLines);
    }

    /// <summary>Number of kept lines; their slots are 0 to Count − 1.</summary>
    public int Count { get; private set; }

    /// <summary>Line in a slot.</summary>
    public int LineAt(int slot) => _line[slot];

    /// <summary>Slot of a kept line.</summary>
    public int SlotOf(int line) => _slot[line];

    /// <summary>a of a kept line, by free bus.</summary>
    public ReadOnlySpan<double> RowOf(int line) => _row[_slot[line]];

    /// <summary>aᵀa' of a kept line with the line in every slot.</summary>
    public ReadOnlySpan<double> ProductsOf(int line) => _products[_slot[line]].AsSpan(0, Count);

    /// <summary>Keeps a line from now on.</summary>
    /// <param name="line">The line.</param>
    /// <param name="held">Lines that must stay if others have to go to make room.</param>
    public void Keep(int line, ReadOnlySpan<int> held)
    {
        if (_slot[line] != NotKept)
            return;
        if (Count >= _mostRows)
            DropAllBut(held);
        if (Count == _line.Length)
            Grow();
        var slot = Count++;
        _line[slot] = line;
        _slot[line] = slot;
        Compute(line, _row[slot] ??= new double[_freeBus.Length]);
        _products[slot] ??= new double[_line.Length];
        for (var other = 0; other <= slot; other++)
        {
            var product = Dense.Dot(_row[slot], _row[other]);
            _products[slot][other] = product;
            _products[other][slot] = product;
        }
    }

    private void Grow()
    {
        Array.Resize(ref _line, 2 * _line.Length);
        Array.Resize(ref _row, _line.Length);
        Array.Resize(ref _products, _line.Length);
        for (var slot = 0; slot < Count; slot++)
            Array.Resize(ref _products[slot], _line.Length);
    }

    private void Compute(int line, double[] row)
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
        for (var k = 0; k < row.Length; k++)
            row[k] = _graph.IslandOf[_freeBus[k]] == island ? _rootWeight[k] * (_angle[_freeBus[k]] - mean) : 0;
    }

    private void DropAllBut(ReadOnlySpan<int> held)
    {
        var dropped = _line.AsSpan(0, Count).ToArray();
        foreach (var line in dropped)
            _slot[line] = NotKept;
        Count = 0;
        foreach (var line in held)
            Keep(line, []);
    }
}
