namespace Halfvoice.Optimization;

/// <summary>
/// The Newton system after all bounded items are eliminated, in angles θ and prices λ:
/// [[H, B], [B, −D]] with H = Aᵀ diag(b² w) A, B = Aᵀ diag(b) A (A the line-bus incidence), w the weight of a limited line
/// and D the sum of the flexibilities of the blocks at a bus.
/// </summary>
/// <remarks>
/// Constant angles in an island are fixed by adding 1 to H at its reference bus. That changes no solution: the right-hand
/// side of the angle rows sums to zero over an island, and so do the columns of H and B, hence the reference angle is 0. An island without
/// any free block gets the same treatment in D, for its prices.
/// </remarks>
internal sealed class KktSystem
{
    private const int MaxRefinements = 8;

    private readonly ScaledProgram _program;
    private readonly GridGraph _graph;
    private readonly BlockLdl _factor;
    private readonly double[] _diagonalH;
    private readonly double[] _diagonalB;
    private readonly double[] _diagonalD;
    private readonly double[] _edgeH;
    private readonly double[] _edgeB;
    private readonly bool[] _priceless;
    private readonly double[] _residualAngle;
    private readonly double[] _residualPrice;

    public KktSystem(ScaledProgram program)
    {
        _program = program;
        _graph = program.Graph;
        var buses = _graph.BusCount;
        var edges = _graph.EdgeA.Length;
        _diagonalH = new double[buses];
        _diagonalB = new double[buses];
        _diagonalD = new double[buses];
        _edgeH = new double[edges];
        _edgeB = new double[edges];
        _residualAngle = new double[buses];
        _residualPrice = new double[buses];
        var rowSize = new double[buses];
        for (var l = 0; l < _graph.LineCount; l++)
        {
            var b = program.Susceptance[l];
            _diagonalB[_graph.From[l]] += b;
            _diagonalB[_graph.To[l]] += b;
            _edgeB[_graph.EdgeOfLine[l]] -= b;
            rowSize[_graph.From[l]] += Math.Abs(b);
            rowSize[_graph.To[l]] += Math.Abs(b);
        }

        _factor = new BlockLdl(_graph.Pattern, rowSize);
        _priceless = new bool[_graph.IslandCount];
        Array.Fill(_priceless, true);
        foreach (var bus in program.BusOf)
            _priceless[_graph.IslandOf[bus]] = false;
    }

    /// <summary>Largest residual of the last solve, relative to the right-hand side.</summary>
    public double RelativeResidual { get; private set; }

    /// <summary>Factors the system for given flexibilities of blocks (dv/dλ) and weights of lines, by item.</summary>
    public void Factor(double[] weight)
    {
        Array.Clear(_diagonalH);
        Array.Clear(_diagonalD);
        Array.Clear(_edgeH);
        for (var j = 0; j < _program.FreeCount; j++)
            _diagonalD[_program.BusOf[j]] += weight[j];
        for (var j = _program.FreeCount; j < _program.Count; j++)
        {
            var line = _program.LineOfItem[j - _program.FreeCount];
            var b = _program.Susceptance[line];
            var h = b * b * weight[j];
            _diagonalH[_graph.From[line]] += h;
            _diagonalH[_graph.To[line]] += h;
            _edgeH[_graph.EdgeOfLine[line]] -= h;
        }

        for (var island = 0; island < _priceless.Length; island++)
        {
            _diagonalH[_graph.ReferenceBus[island]] += 1;
            if (_priceless[island])
                _diagonalD[_graph.ReferenceBus[island]] += 1;
        }

        _factor.Factor(_diagonalH, _diagonalB, _diagonalD, _edgeH, _edgeB);
    }

    /// <summary>Solves H x + B y = rhsAngle, B x − D y = rhsPrice, refining until the residual no longer halves.</summary>
    public void Solve(double[] rhsAngle, double[] rhsPrice, double[] angle, double[] price)
    {
        var size = Math.Max(Largest(rhsAngle), Largest(rhsPrice));
        Array.Clear(angle);
        Array.Clear(price);
        RelativeResidual = 0;
        if (size == 0)
            return;
        rhsAngle.CopyTo(_residualAngle, 0);
        rhsPrice.CopyTo(_residualPrice, 0);
        var last = double.PositiveInfinity;
        for (var step = 0; step <= MaxRefinements; step++)
        {
            _factor.Solve(_residualAngle, _residualPrice);
            for (var i = 0; i < angle.Length; i++)
            {
                angle[i] += _residualAngle[i];
                price[i] += _residualPrice[i];
            }

            Residual(rhsAngle, rhsPrice, angle, price);
            var now = Math.Max(Largest(_residualAngle), Largest(_residualPrice));
            RelativeResidual = now / size;
            if (RelativeResidual < 1e-14 || !(now < 0.5 * last))
                return;
            last = now;
        }
    }

    private void Residual(double[] rhsAngle, double[] rhsPrice, double[] angle, double[] price)
    {
        for (var i = 0; i < angle.Length; i++)
        {
            _residualAngle[i] = rhsAngle[i];
            _residualPrice[i] = rhsPrice[i] + (_diagonalD[i] * price[i]);
        }

        foreach (var bus in _graph.ReferenceBus)
            _residualAngle[bus] -= angle[bus];
        for (var e = 0; e < _edgeB.Length; e++)
        {
            // Edge values are minus the sums over the edge's lines, so differences across the edge give H x, B y and B x.
            int a = _graph.EdgeA[e], b = _graph.EdgeB[e];
            var across = angle[a] - angle[b];
            var flow = _edgeB[e] * across;
            var pull = (_edgeH[e] * across) + (_edgeB[e] * (price[a] - price[b]));
            _residualAngle[a] += pull;
            _residualAngle[b] -= pull;
            _residualPrice[a] += flow;
            _residualPrice[b] -= flow;
        }
    }

    private static double Largest(double[] values)
    {
        double largest = 0;
        foreach (var value in values)
            largest = Math.Max(largest, Math.Abs(value));
        return largest;
    }
}
