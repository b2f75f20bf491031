namespace Halfvoice.Optimization;

/// <summary>
/// Takes an interior solution to the vertex or face that it points at: bounds whose multiplier exceeds their slack are held
/// exactly, and the remaining equality-constrained problem is solved by a proximal Newton method (one factorisation,
/// a few solves). A guess that turns out wrong is corrected a few times; the result counts only if every condition holds.
/// </summary>
internal sealed class Polish
{
    private const double Proximity = 1e-8;
    private const int MaxGuesses = 6;
    private const int MaxSteps = 12;
    private const double Feasible = 1e-10;
    private const double Consistent = 1e-6;

    private readonly ScaledProgram _program;
    private readonly KktSystem _kkt;
    private readonly Residuals _residuals;
    private readonly sbyte[] _side;
    private readonly double[] _weight;
    private readonly double[] _rhsAngle;
    private readonly double[] _rhsPrice;
    private readonly double[] _stepAngle;
    private readonly double[] _stepPrice;

    public Polish(ScaledProgram program, KktSystem kkt)
    {
        _program = program;
        _kkt = kkt;
        _residuals = new Residuals(program);
        _side = new sbyte[program.Count];
        _weight = new double[program.Count];
        _rhsAngle = new double[program.Graph.BusCount];
        _rhsPrice = new double[program.Graph.BusCount];
        _stepAngle = new double[program.Graph.BusCount];
        _stepPrice = new double[program.Graph.BusCount];
        Point = new Iterate(program);
    }

    /// <summary>The polished point; meaningful only after <see cref="Run"/> said true.</summary>
    public Iterate Point { get; }

    /// <summary>Polishes a copy of a point; false if no guess led to a point that meets all conditions.</summary>
    public bool Run(Iterate start)
    {
        start.CopyTo(Point);
        Guess();
        for (var guess = 0; guess < MaxGuesses; guess++)
        {
            Hold();
            _kkt.Factor(_weight);
            var error = Refine();
            // A large error means that the held bounds contradict each other; what follows from them says nothing about the rest.
            if (!(error <= Consistent))
                return false;
            if (!CorrectGuess())
                return error <= Feasible;
        }

        return false;
    }

    private void Guess()
    {
        for (var j = 0; j < _program.LimitedEnd; j++)
        {
            var atLower = !double.IsNegativeInfinity(_program.Lower[j]) && Point.BelowSlack[j] < Point.BelowDual[j];
            var atUpper = !double.IsPositiveInfinity(_program.Upper[j]) && Point.AboveSlack[j] < Point.AboveDual[j];
            _side[j] = (sbyte)(atLower ? -1 : atUpper ? 1 : 0);
        }
    }

    private void Hold()
    {
        for (var j = 0; j < _program.LimitedEnd; j++)
        {
            if (_side[j] != 0)
                Point.Value[j] = _side[j] < 0 ? _program.Lower[j] : _program.Upper[j];
            if (j < _program.FreeCount)
            {
                _weight[j] = _side[j] != 0 ? 0 : 1 / (_program.Slope[j] + Proximity);
                continue;
            }

            // While polishing, the upper multiplier of a held line carries either sign.
            _weight[j] = _side[j] != 0 ? 1 / Proximity : 0;
            Point.AboveDual[j] = _side[j] != 0 ? Point.AboveDual[j] - Point.BelowDual[j] : 0;
            Point.BelowDual[j] = 0;
        }

        for (var j = _program.LimitedEnd; j < _program.Count; j++)
            _weight[j] = 1 / Proximity;
    }

    private double Refine()
    {
        var last = double.PositiveInfinity;
        for (var step = 0; ; step++)
        {
            SetDependent();
            _residuals.Evaluate(Point);
            var error = Math.Max(_residuals.Primal, _residuals.Dual);
            if (step >= MaxSteps || error < 1e-15 || !(error < 0.5 * last))
                return error;
            last = error;
            Step();
        }
    }

    /// <summary>What follows from angles and prices: multipliers of held blocks and flows of free lines.</summary>
    private void SetDependent()
    {
        for (var j = 0; j < _program.FreeCount; j++)
        {
            var reduced = _program.Cost[j] + (_program.Slope[j] * Point.Value[j]) - Point.Price[_program.BusOf[j]];
            Point.BelowDual[j] = _side[j] < 0 ? reduced : 0;
            Point.AboveDual[j] = _side[j] > 0 ? -reduced : 0;
        }

        for (var j = _program.FreeCount; j < _program.LimitedEnd; j++)
        {
            if (_side[j] == 0)
                Point.Value[j] = Flow(j);
        }
    }

    private double Flow(int j)
    {
        var line = _program.LineOfItem[j - _program.FreeCount];
        return _program.Susceptance[line]
            * (Point.Angle[_program.Graph.From[line]] - Point.Angle[_program.Graph.To[line]]);
    }

    private void Step()
    {
        var graph = _program.Graph;
        for (var i = 0; i < _rhsAngle.Length; i++)
        {
            _rhsAngle[i] = -_residuals.Angle[i];
            _rhsPrice[i] = _residuals.Balance[i];
        }

        for (var j = 0; j < _program.FreeCount; j++)
            _rhsPrice[_program.BusOf[j]] -= _weight[j] * _residuals.Item[j];
        for (var j = _program.FreeCount; j < _program.Count; j++)
        {
            var line = _program.LineOfItem[j - _program.FreeCount];
            var push = _program.Susceptance[line] * _weight[j] * _residuals.Item[j];
            _rhsAngle[graph.From[line]] -= push;
            _rhsAngle[graph.To[line]] += push;
        }

        _kkt.Solve(_rhsAngle, _rhsPrice, _stepAngle, _stepPrice);
        for (var j = 0; j < _program.FreeCount; j++)
            Point.Value[j] += _weight[j] * (_stepPrice[_program.BusOf[j]] - _residuals.Item[j]);
        for (var j = _program.FreeCount; j < _program.Count; j++)
        {
            var line = _program.LineOfItem[j - _program.FreeCount];
            var across = _stepAngle[graph.From[line]] - _stepAngle[graph.To[line]];
            Point.AboveDual[j] += _weight[j] * ((_program.Susceptance[line] * across) + _residuals.Item[j]);
        }

        for (var i = 0; i < _rhsAngle.Length; i++)
        {
            Point.Angle[i] += _stepAngle[i];
            Point.Price[i] += _stepPrice[i];
        }
    }

    /// <summary>Holds what left its bounds and frees what is held by a multiplier of the wrong sign; true if anything changed.</summary>
    private bool CorrectGuess()
    {
        var changed = false;
        for (var j = 0; j < _program.LimitedEnd; j++)
        {
            var before = _side[j];
            var dual = j < _program.FreeCount ? Point.BelowDual[j] + Point.AboveDual[j] : before * Point.AboveDual[j];
            if (before != 0 && dual < -Feasible)
                _side[j] = 0;
            else if (before == 0 && Point.Value[j] < _program.Lower[j] - Feasible)
                _side[j] = -1;
            else if (before == 0 && Point.Value[j] > _program.Upper[j] + Feasible)
                _side[j] = 1;
            changed |= before != _side[j];
        }

        return changed;
    }
}
