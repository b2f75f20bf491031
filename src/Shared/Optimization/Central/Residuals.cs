namespace Halfvoice.Optimization;

/// <summary>
/// How far a point is from the optimality conditions of a scaled program. With y the multiplier of a line's limit
/// (above less below): balance Σv − Bθ − d, line b(θ_f − θ_t) − v, angle Bλ + Aᵀ b y, block c + q v − λ − below + above.
/// </summary>
internal sealed class Residuals
{
    private readonly ScaledProgram _program;
    private readonly double _demandSize;
    private readonly double _costSize;

    public Residuals(ScaledProgram program)
    {
        _program = program;
        Balance = new double[program.Graph.BusCount];
        Angle = new double[program.Graph.BusCount];
        Item = new double[program.Count];
        _demandSize = 1 + Largest(program.Demand);
        _costSize = 1 + Largest(program.Cost);
    }

    /// <summary>By bus.</summary>
    public double[] Balance { get; }

    /// <summary>By bus.</summary>
    public double[] Angle { get; }

    /// <summary>By item: dual residual of a block, flow residual of a line.</summary>
    public double[] Item { get; }

    /// <summary>Largest balance or flow residual, relative to demand.</summary>
    public double Primal { get; private set; }

    /// <summary>Largest dual residual, relative to costs.</summary>
    public double Dual { get; private set; }

    /// <summary>Sum of slack times multiplier over all bounds.</summary>
    public double Complementarity { get; private set; }

    /// <summary>Number of finite bounds.</summary>
    public int Bounds { get; private set; }

    /// <summary>Cost of the point.</summary>
    public double Cost { get; private set; }

    /// <summary>Complementarity relative to the cost.</summary>
    public double Gap => Complementarity / (1 + Math.Abs(Cost));

    public void Evaluate(Iterate point)
    {
        var graph = _program.Graph;
        for (var i = 0; i < Balance.Length; i++)
        {
            Balance[i] = -_program.Demand[i];
            Angle[i] = 0;
        }

        Cost = 0;
        for (var j = 0; j < _program.FreeCount; j++)
        {
            var v = point.Value[j];
            var marginal = _program.Cost[j] + (_program.Slope[j] * v);
            Cost += (_program.Cost[j] + (0.5 * _program.Slope[j] * v)) * v;
            Balance[_program.BusOf[j]] += v;
            Item[j] = marginal - point.Price[_program.BusOf[j]] - point.BelowDual[j] + point.AboveDual[j];
        }

        for (var l = 0; l < graph.LineCount; l++)
        {
            int from = graph.From[l], to = graph.To[l];
            var b = _program.Susceptance[l];
            var flow = b * (point.Angle[from] - point.Angle[to]);
            var pull = b * (point.Price[from] - point.Price[to]);
            Balance[from] -= flow;
            Balance[to] += flow;
            Angle[from] += pull;
            Angle[to] -= pull;
        }

        for (var j = _program.FreeCount; j < _program.Count; j++)
        {
            var line = _program.LineOfItem[j - _program.FreeCount];
            int from = graph.From[line], to = graph.To[line];
            var b = _program.Susceptance[line];
            Item[j] = (b * (point.Angle[from] - point.Angle[to])) - point.Value[j];
            var push = b * (point.AboveDual[j] - point.BelowDual[j]);
            Angle[from] += push;
            Angle[to] -= push;
        }

        Summarise(point);
    }

    private void Summarise(Iterate point)
    {
        var flow = Largest(Item.AsSpan(_program.FreeCount));
        Primal = Math.Max(Largest(Balance), flow) / _demandSize;
        Dual = Math.Max(Largest(Angle), Largest(Item.AsSpan(0, _program.FreeCount))) / _costSize;
        Complementarity = 0;
        Bounds = 0;
        for (var j = 0; j < _program.LimitedEnd; j++)
        {
            if (!double.IsNegativeInfinity(_program.Lower[j]))
            {
                Complementarity += point.BelowSlack[j] * point.BelowDual[j];
                Bounds++;
            }

            if (!double.IsPositiveInfinity(_program.Upper[j]))
            {
                Complementarity += point.AboveSlack[j] * point.AboveDual[j];
                Bounds++;
            }
        }
    }

    private static double Largest(ReadOnlySpan<double> values)
    {
        double largest = 0;
        foreach (var value in values)
            largest = Math.Max(largest, Math.Abs(value));
        return largest;
    }
}
