namespace Halfvoice.Optimization;

/// <summary>
/// Writes every angle of an area as an affine function of few: its copies, and whatever inner angles the balances do
/// not fix. The balances L θ = x (x the net injections) are solved for the inner angles by Gauss-Jordan elimination
/// with the largest pivot of all rows and columns left, so a singular inner matrix (a series capacitor may cause one,
/// and an area on its own always has one) just leaves an angle over.
/// </summary>
internal sealed class AreaReduction
{
    /// <summary>Entries below this share of the largest susceptance are rounding of an exact 0.</summary>
    private const double ZeroShare = 1e-11;

    private readonly int _own;
    private readonly int _nodes;
    private readonly double[,] _work;
    private readonly int[] _rowOfNode;
    private readonly List<int> _angleNodes;
    private readonly List<int> _leftRows;

    public AreaReduction(AreaModel model)
    {
        _own = model.OwnBusCount;
        _nodes = model.NodeCount;
        _work = new double[_own, _nodes + _own];
        var largest = 1e-300;
        foreach (var line in model.Lines)
        {
            AddLine(line.From, line.To, line.SusceptanceMwPerRad);
            AddLine(line.To, line.From, line.SusceptanceMwPerRad);
            largest = Math.Max(largest, Math.Abs(line.SusceptanceMwPerRad));
        }

        for (var bus = 0; bus < _own; bus++)
            _work[bus, _nodes + bus] = -1;
        LargestSusceptance = largest;
        _rowOfNode = new int[_nodes];
        Array.Fill(_rowOfNode, -1);
        _angleNodes = [.. model.CopyNodes];
        var inner = Enumerable.Range(0, _own).Except(model.CopyNodes).ToList();
        _leftRows = Enumerable.Range(0, _own).ToList();
        Eliminate(inner);
        _angleNodes.AddRange(inner);
    }

    /// <summary>Angles that stay variables: the copies in their order, then the inner angles left over.</summary>
    public int AngleCount => _angleNodes.Count;

    /// <summary>Balances that stay equations.</summary>
    public int EquationCount => _leftRows.Count;

    /// <summary>Largest susceptance in size, MW/rad: the scale of the rows.</summary>
    public double LargestSusceptance { get; }

    /// <summary>A left-over balance: 0 = Σ angle_a · θ_a + Σ injection_b · x_b.</summary>
    public void Equation(int index, Span<double> angles, Span<double> injections) =>
        ReadRow(_leftRows[index], 1, angles, injections);

    /// <summary>The angle of a node: θ = Σ angle_a · θ_a + Σ injection_b · x_b.</summary>
    public void Angle(int node, Span<double> angles, Span<double> injections)
    {
        if (_rowOfNode[node] >= 0)
        {
            ReadRow(_rowOfNode[node], -1, angles, injections);
            return;
        }

        angles.Clear();
        injections.Clear();
        angles[_angleNodes.IndexOf(node)] = 1;
    }

    private void ReadRow(int row, int sign, Span<double> angles, Span<double> injections)
    {
        for (var a = 0; a < angles.Length; a++)
            angles[a] = sign * _work[row, _angleNodes[a]];
        for (var b = 0; b < injections.Length; b++)
            injections[b] = sign * _work[row, _nodes + b];
    }

    private void AddLine(int at, int other, double susceptance)
    {
        if (at >= _own)
            return;
        _work[at, at] += susceptance;
        _work[at, other] -= susceptance;
    }

    private void Eliminate(List<int> inner)
    {
        while (true)
        {
            var size = 0.0;
            int pivotRow = -1, pivotNode = -1;
            foreach (var row in _leftRows)
            {
                foreach (var node in inner)
                {
                    if (Math.Abs(_work[row, node]) > size)
                        (size, pivotRow, pivotNode) = (Math.Abs(_work[row, node]), row, node);
                }
            }

            if (size <= ZeroShare * LargestSusceptance)
                break;
            Pivot(pivotRow, pivotNode);
            _rowOfNode[pivotNode] = pivotRow;
            _leftRows.Remove(pivotRow);
            inner.Remove(pivotNode);
        }

        foreach (var row in _leftRows)
        {
            foreach (var node in inner)
                _work[row, node] = 0;
        }
    }

    private void Pivot(int pivotRow, int pivotNode)
    {
        var columns = _nodes + _own;
        var inverse = 1 / _work[pivotRow, pivotNode];
        for (var c = 0; c < columns; c++)
            _work[pivotRow, c] *= inverse;
        for (var row = 0; row < _own; row++)
        {
            var factor = _work[row, pivotNode];
            if (row == pivotRow || factor == 0)
                continue;
            for (var c = 0; c < columns; c++)
                _work[row, c] -= factor * _work[pivotRow, c];
            _work[row, pivotNode] = 0;
        }
    }
}
