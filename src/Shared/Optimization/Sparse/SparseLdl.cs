namespace Halfvoice.Optimization;

/// <summary>
/// Sparse LDLᵀ of a symmetric matrix with one row per bus and one off-diagonal value per edge; used for the susceptance
/// matrix, which negative reactances can make indefinite. Pivots next to zero are shifted; the caller refines.
/// No allocation after the constructor.
/// </summary>
internal sealed class SparseLdl
{
    private const double TinyPivot = 1e-9;

    private readonly SymbolicFactor _pattern;
    private readonly double[] _lower;
    private readonly double[] _pivot;
    private readonly double[] _row;
    private readonly int[] _next;

    public SparseLdl(SymbolicFactor pattern)
    {
        _pattern = pattern;
        _lower = new double[pattern.ColumnRow.Length];
        _pivot = new double[pattern.Count];
        _row = new double[pattern.Count];
        _next = new int[pattern.Count];
    }

    /// <summary>Pivots that had to be shifted in the last factorisation.</summary>
    public int ShiftedPivots { get; private set; }

    /// <summary>Factors the matrix given by its diagonal (by bus) and its off-diagonal values (by edge).</summary>
    /// <param name="diagonal">By bus.</param>
    /// <param name="edgeValue">By edge.</param>
    /// <param name="rowSize">By bus, above 0: the size of what was summed up in its row, the yardstick for a pivot next to zero.</param>
    public void Factor(double[] diagonal, double[] edgeValue, double[] rowSize)
    {
        ShiftedPivots = 0;
        _pattern.ColumnStart.AsSpan(0, _pattern.Count).CopyTo(_next);
        for (var k = 0; k < _pattern.Count; k++)
        {
            var size = rowSize[_pattern.Order[k]];
            for (var t = _pattern.EntryStart[k]; t < _pattern.EntryStart[k + 1]; t++)
                _row[_pattern.EntryColumn[t]] = edgeValue[_pattern.EntryEdge[t]];

            var pivot = diagonal[_pattern.Order[k]];
            for (var t = _pattern.RowStart[k]; t < _pattern.RowStart[k + 1]; t++)
            {
                var i = _pattern.RowColumn[t];
                var y = _row[i];
                _row[i] = 0;
                var end = _next[i];
                for (var p = _pattern.ColumnStart[i]; p < end; p++)
                    _row[_pattern.ColumnRow[p]] -= _lower[p] * y;
                var l = y / _pivot[i];
                _lower[end] = l;
                _next[i] = end + 1;
                pivot -= l * y;
            }

            if (!(Math.Abs(pivot) > TinyPivot * size))
            {
                ShiftedPivots++;
                pivot = Math.CopySign(10 * TinyPivot * size, pivot);
            }

            _pivot[k] = pivot;
        }
    }

    /// <summary>Solves in place; the vector is in the numbering of the grid, the work space as long.</summary>
    public void Solve(Span<double> vector, Span<double> work)
    {
        var order = _pattern.Order;
        for (var k = 0; k < order.Length; k++)
            work[k] = vector[order[k]];
        for (var k = 0; k < order.Length; k++)
        {
            var x = work[k];
            if (x == 0)
                continue;
            for (var p = _pattern.ColumnStart[k]; p < _pattern.ColumnStart[k + 1]; p++)
                work[_pattern.ColumnRow[p]] -= _lower[p] * x;
        }

        for (var k = order.Length - 1; k >= 0; k--)
        {
            var x = work[k] / _pivot[k];
            for (var p = _pattern.ColumnStart[k]; p < _pattern.ColumnStart[k + 1]; p++)
                x -= _lower[p] * work[_pattern.ColumnRow[p]];
            work[k] = x;
            vector[order[k]] = x;
        }
    }
}
