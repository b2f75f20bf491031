namespace Halfvoice.Optimization;

/// <summary>
/// Primal-dual interior-point method with predictor and corrector (Mehrotra 1992, from memory) for a scaled network program.
/// Starts infeasible; every item stays strictly between its bounds. One factorisation and two solves an iteration.
/// </summary>
internal sealed class InteriorPoint
{
    // Proximal terms around the current point, ρ/2 dv² for blocks and δ/2 dy² for line multipliers (Friedlander and Orban 2012,
    // from memory). They vanish with the step and keep the weights of the Newton system below 1/ρ: without them a line
    // at its limit would drown the rest of its row in rounding. A line held at zero has nothing else.
    private const double Proximity = 1e-9;

    // Steps below this, this many times in a row, mean that the iterates have nowhere to go.
    private const double ShortStep = 1e-5;
    private const int ShortStepsInARow = 5;

    // Iterations without a better point after which the problem is taken to have no solution nearby; the caller finds out why.
    private const int PatienceIterations = 12;

    private readonly ScaledProgram _program;
    private readonly OptimumOptions _options;
    private readonly KktSystem _kkt;
    private readonly Residuals _residuals;
    private readonly Iterate _step;
    private readonly double[] _weight;
    private readonly double[] _damp;
    private readonly double[] _shift;
    private readonly double[] _belowTarget;
    private readonly double[] _aboveTarget;
    private readonly double[] _rhsAngle;
    private readonly double[] _rhsPrice;

    public InteriorPoint(ScaledProgram program, KktSystem kkt, OptimumOptions options)
    {
        _program = program;
        _options = options;
        _kkt = kkt;
        _residuals = new Residuals(program);
        Point = new Iterate(program);
        Best = new Iterate(program);
        _step = new Iterate(program);
        _weight = new double[program.Count];
        _damp = new double[program.Count];
        _shift = new double[program.Count];
        _belowTarget = new double[program.Count];
        _aboveTarget = new double[program.Count];
        _rhsAngle = new double[program.Graph.BusCount];
        _rhsPrice = new double[program.Graph.BusCount];
    }

    /// <summary>The current point.</summary>
    public Iterate Point { get; }

    /// <summary>The point with the smallest error so far.</summary>
    public Iterate Best { get; }

    /// <summary>Largest of primal residual, dual residual and gap at <see cref="Best"/>.</summary>
    public double BestError { get; private set; } = double.PositiveInfinity;

    /// <summary>Iterations done.</summary>
    public int Iterations { get; private set; }

    /// <summary>
    /// Runs until a tolerance is met (true), or nothing moves any more or the iterations run out (false). Goes on from where
    /// it stopped when called again with a smaller tolerance.
    /// </summary>
    public bool Run(double tolerance)
    {
        if (Iterations == 0)
            StartingPoint.Set(_program, Point);
        var shortSteps = 0;
        var lastBetter = Iterations;
        for (; ; Iterations++)
        {
            _residuals.Evaluate(Point);
            var error = Math.Max(Math.Max(_residuals.Primal, _residuals.Dual), _residuals.Gap);
            if (!double.IsFinite(error))
                return false;
            if (error < BestError)
            {
                lastBetter = error < 0.9 * BestError ? Iterations : lastBetter;
                BestError = error;
                Point.CopyTo(Best);
            }

            if (error <= tolerance)
                return true;
            if (Iterations >= _options.MaxIterations || shortSteps >= ShortStepsInARow
                || Iterations - lastBetter > PatienceIterations)
                return false;
            var step = Advance();
            shortSteps = step < ShortStep ? shortSteps + 1 : 0;
        }
    }

    /// <summary>One predictor-corrector iteration; returns the shorter of the two step lengths.</summary>
    private double Advance()
    {
        Weigh();
        _kkt.Factor(_weight);
        var mu = _residuals.Complementarity / Math.Max(1, _residuals.Bounds);
        Aim(0, false);
        Direction();
        var (primal, dual) = StepLengths(1);
        var reached = ComplementarityAfter(primal, dual) / Math.Max(1, _residuals.Bounds);
        var ratio = mu > 0 ? Math.Max(0, reached / mu) : 0;
        var sigma = ratio * ratio * ratio;
        Aim(sigma * mu, true);
        Direction();
        var fraction = Math.Max(0.995, 1 - mu);
        (primal, dual) = StepLengths(fraction);
        if (Math.Min(primal, dual) < 0.1)
        {
            // The second-order term spoiled the direction: take a plain, better centred step.
            Aim(Math.Max(sigma, 0.5) * mu, false);
            Direction();
            (primal, dual) = StepLengths(fraction);
        }

        Move(primal, dual);
        return Math.Min(primal, dual);
    }

    /// <summary>
    /// With κ = below/slack + above/slack: dv/dλ of a block, 1 / (q + κ + ρ), and the weight κ / (1 + δκ) of a line,
    /// together with its damping 1 / (1 + δκ).
    /// </summary>
    private void Weigh()
    {
        for (var j = 0; j < _program.LimitedEnd; j++)
        {
            var barrier = 0.0;
            if (!double.IsNegativeInfinity(_program.Lower[j]))
                barrier += Point.BelowDual[j] / Point.BelowSlack[j];
            if (!double.IsPositiveInfinity(_program.Upper[j]))
                barrier += Point.AboveDual[j] / Point.AboveSlack[j];
            _damp[j] = 1 / (1 + (Proximity * barrier));
            _weight[j] = j < _program.FreeCount ? 1 / (_program.Slope[j] + barrier + Proximity) : barrier * _damp[j];
        }

        for (var j = _program.LimitedEnd; j < _program.Count; j++)
            _weight[j] = 1 / Proximity;
    }

    /// <summary>Right-hand side of slack · multiplier = target, with the second-order term of the last direction if asked for.</summary>
    private void Aim(double target, bool secondOrder)
    {
        for (var j = 0; j < _program.LimitedEnd; j++)
        {
            _belowTarget[j] = 0;
            _aboveTarget[j] = 0;
            if (!double.IsNegativeInfinity(_program.Lower[j]))
            {
                var second = secondOrder ? _step.Value[j] * _step.BelowDual[j] : 0;
                _belowTarget[j] = target - (Point.BelowSlack[j] * Point.BelowDual[j]) - second;
            }

            if (!double.IsPositiveInfinity(_program.Upper[j]))
            {
                var second = secondOrder ? -_step.Value[j] * _step.AboveDual[j] : 0;
                _aboveTarget[j] = target - (Point.AboveSlack[j] * Point.AboveDual[j]) - second;
            }
        }
    }

    /// <summary>
    /// Newton direction: blocks dv = w (dλ + e) with e = −r + below/slack − above/slack (targets over slacks), lines
    /// dy = w b(dθ_f − dθ_t) + g with g = w r + damping · (above/slack − below/slack), and dv = b(dθ_f − dθ_t) + r − δ dy; what is
    /// left is the system of <see cref="KktSystem"/>.
    /// </summary>
    private void Direction()
    {
        var graph = _program.Graph;
        for (var i = 0; i < _rhsAngle.Length; i++)
        {
            _rhsAngle[i] = -_residuals.Angle[i];
            _rhsPrice[i] = _residuals.Balance[i];
        }

        for (var j = 0; j < _program.Count; j++)
        {
            var pull = BelowPull(j) - AbovePull(j);
            if (j < _program.FreeCount)
            {
                _shift[j] = pull - _residuals.Item[j];
                _rhsPrice[_program.BusOf[j]] += _weight[j] * _shift[j];
                continue;
            }

            _shift[j] = (_weight[j] * _residuals.Item[j]) - (_damp[j] * pull);
            var line = _program.LineOfItem[j - _program.FreeCount];
            var push = _program.Susceptance[line] * _shift[j];
            _rhsAngle[graph.From[line]] -= push;
            _rhsAngle[graph.To[line]] += push;
        }

        _kkt.Solve(_rhsAngle, _rhsPrice, _step.Angle, _step.Price);
        for (var j = 0; j < _program.FreeCount; j++)
            Complete(j, _weight[j] * (_step.Price[_program.BusOf[j]] + _shift[j]));
        for (var j = _program.FreeCount; j < _program.Count; j++)
        {
            var line = _program.LineOfItem[j - _program.FreeCount];
            var across = _step.Angle[graph.From[line]] - _step.Angle[graph.To[line]];
            var flow = _program.Susceptance[line] * across;
            var dual = (_weight[j] * flow) + _shift[j];
            if (j < _program.LimitedEnd)
                Complete(j, flow + _residuals.Item[j] - (Proximity * dual));
            else
                _step.AboveDual[j] = dual;
        }
    }

    private double BelowPull(int j) =>
        double.IsNegativeInfinity(_program.Lower[j]) ? 0 : _belowTarget[j] / Point.BelowSlack[j];

    private double AbovePull(int j) =>
        double.IsPositiveInfinity(_program.Upper[j]) ? 0 : _aboveTarget[j] / Point.AboveSlack[j];

    private void Complete(int j, double move)
    {
        _step.Value[j] = move;
        if (!double.IsNegativeInfinity(_program.Lower[j]))
            _step.BelowDual[j] = (_belowTarget[j] - (Point.BelowDual[j] * move)) / Point.BelowSlack[j];
        if (!double.IsPositiveInfinity(_program.Upper[j]))
            _step.AboveDual[j] = (_aboveTarget[j] + (Point.AboveDual[j] * move)) / Point.AboveSlack[j];
    }

    /// <summary>
    /// Longest steps that keep slacks and multipliers positive, shortened by the fraction. Linear programs may move primal and
    /// dual by different lengths; a slope ties the dual residual to both, which then need the same length.
    /// </summary>
    private (double Primal, double Dual) StepLengths(double fraction)
    {
        double primal = 1 / fraction, dual = 1 / fraction;
        for (var j = 0; j < _program.LimitedEnd; j++)
        {
            var move = _step.Value[j];
            if (!double.IsNegativeInfinity(_program.Lower[j]))
            {
                if (move < 0)
                    primal = Math.Min(primal, Point.BelowSlack[j] / -move);
                if (_step.BelowDual[j] < 0)
                    dual = Math.Min(dual, Point.BelowDual[j] / -_step.BelowDual[j]);
            }

            if (!double.IsPositiveInfinity(_program.Upper[j]))
            {
                if (move > 0)
                    primal = Math.Min(primal, Point.AboveSlack[j] / move);
                if (_step.AboveDual[j] < 0)
                    dual = Math.Min(dual, Point.AboveDual[j] / -_step.AboveDual[j]);
            }
        }

        primal = Math.Min(1, fraction * primal);
        dual = Math.Min(1, fraction * dual);
        return _program.IsLinear ? (primal, dual) : (Math.Min(primal, dual), Math.Min(primal, dual));
    }

    private double ComplementarityAfter(double primal, double dual)
    {
        double sum = 0;
        for (var j = 0; j < _program.LimitedEnd; j++)
        {
            var move = primal * _step.Value[j];
            if (!double.IsNegativeInfinity(_program.Lower[j]))
                sum += (Point.BelowSlack[j] + move) * (Point.BelowDual[j] + (dual * _step.BelowDual[j]));
            if (!double.IsPositiveInfinity(_program.Upper[j]))
                sum += (Point.AboveSlack[j] - move) * (Point.AboveDual[j] + (dual * _step.AboveDual[j]));
        }

        return sum;
    }

    private void Move(double primal, double dual)
    {
        for (var j = 0; j < _program.LimitedEnd; j++)
        {
            var move = primal * _step.Value[j];
            Point.Value[j] += move;
            Point.BelowSlack[j] += move;
            Point.AboveSlack[j] -= move;
            Point.BelowDual[j] += dual * _step.BelowDual[j];
            Point.AboveDual[j] += dual * _step.AboveDual[j];
        }

        for (var j = _program.LimitedEnd; j < _program.Count; j++)
            Point.AboveDual[j] += dual * _step.AboveDual[j];
        for (var i = 0; i < Point.Angle.Length; i++)
        {
            Point.Angle[i] += primal * _step.Angle[i];
            Point.Price[i] += dual * _step.Price[i];
        }
    }
}
