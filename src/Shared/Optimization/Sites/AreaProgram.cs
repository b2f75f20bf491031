namespace Halfvoice.Optimization;

/// <summary>
/// An area's quadratic program for one list of units, solved exactly although linear costs leave it not strictly
/// convex: proximal-point steps (Rockafellar 1976, from memory) add σ_j/2 · (x_j − c_j)² to the variables without a
/// curvature of their own and move the centre c to the answer, until the pull σ (x − c) is gone; then the answer meets
/// the optimality conditions of the original problem. Every solve starts from the same centre, so it depends on what is
/// asked alone, up to rounding.
/// </summary>
/// <remarks>
/// On linear costs a step of this kind is exact once σ is small against the price differences that matter (Mangasarian
/// 1979 on linear programs, from memory), so three are usual, the last one to see that nothing pulls any more. Where
/// prices nearly tie or copies hold the angles loosely, plain steps creep; then conjugate directions carry the centre.
/// </remarks>
internal sealed class AreaProgram
{
    public const int OuterStepsMax = 100;

    /// <summary>σ as a share of price scale over range: small enough for two steps, large enough for the factor.</summary>
    private const double ProximalShare = 1e-4;

    /// <summary>Stationary when the proximal pull is below this share of the price scale.</summary>
    private const double StationaryShare = 1e-10;

    /// <summary>What is still an answer when rounding keeps the pull from getting smaller within the bounded steps.</summary>
    private const double AcceptableShare = 1e-7;

    /// <summary>Prices of this share of the dearest unit's set how small a pull can be told from rounding.</summary>
    private const double RoundingShare = 0.01;

    private readonly int _angles;
    private readonly int _own;
    private readonly IReadOnlyList<AreaUnit> _units;
    private readonly DualActiveSet _solver;
    private readonly double _priceScale;
    private readonly double _stationaryScale;
    private readonly double[] _weight;
    private readonly double[] _curvature;
    private readonly double[] _proximal;
    private readonly double[] _startCentre;
    private readonly double[] _rows;
    private readonly double[] _loadShares;
    private readonly double[] _lowerBase;
    private readonly double[] _upperBase;
    private readonly double[] _lower;
    private readonly double[] _upper;
    private readonly double[] _cost;
    private readonly double[] _linear;
    private readonly double[] _centre;
    private readonly double[] _x;
    private readonly double[] _direction;
    private readonly double[] _step;
    private readonly double[] _multipliers;
    private readonly double[] _pricePerMwh;

    public AreaProgram(AreaModel model, AreaReduction reduction, IReadOnlyList<AreaUnit> units, double priceScale)
    {
        _angles = reduction.AngleCount;
        _own = model.OwnBusCount;
        _units = units;
        _priceScale = priceScale;
        _stationaryScale = Math.Max(priceScale, RoundingShare * units.Select(unit => Math.Abs(unit.CostLinear)).DefaultIfEmpty(0).Max());
        _weight = [.. model.CopyWeights];
        var n = _angles + units.Count;
        (_curvature, _proximal, _startCentre, _cost) = (new double[n], new double[n], new double[n], new double[n]);
        (_linear, _centre, _x, _direction, _step) = (new double[n], new double[n], new double[n], new double[n], new double[n]);
        SetCurvature(reduction.LargestSusceptance);
        var rows = new AreaRows(model, reduction, units);
        (_rows, _loadShares, _lowerBase, _upperBase) = (rows.Coefficients, rows.LoadShares, rows.Lower, rows.Upper);
        (_lower, _upper, _multipliers) = (new double[_lowerBase.Length], new double[_lowerBase.Length], new double[_lowerBase.Length]);
        _pricePerMwh = new double[_own];
        var hessian = new double[n * n];
        for (var j = 0; j < n; j++)
            hessian[(j * n) + j] = _curvature[j] + _proximal[j];
        _solver = new DualActiveSet(hessian, n, _rows, reduction.EquationCount);
    }

    /// <summary>The answer: angles, then unit outputs.</summary>
    public ReadOnlySpan<double> X => _x;

    /// <summary>Nodal prices of the own buses, $/MWh.</summary>
    public ReadOnlySpan<double> PricePerMwh => _pricePerMwh;

    /// <summary>Largest proximal pull left, $/MWh.</summary>
    public double StationarityPerMwh { get; private set; }

    public int OuterSteps { get; private set; }

    public void Forget() => _solver.Forget();

    /// <summary>Solves for net loads (loads less fixed outputs) and anchors.</summary>
    public DualActiveSetStatus Solve(ReadOnlySpan<double> netLoadMw, ReadOnlySpan<double> anchorRad)
    {
        SetBounds(netLoadMw);
        for (var c = 0; c < anchorRad.Length; c++)
            _cost[c] = -_weight[c] * anchorRad[c];
        _startCentre.CopyTo(_centre, 0);
        for (OuterSteps = 1; OuterSteps < OuterStepsMax; OuterSteps++)
        {
            var status = SolveStep();
            if (status != DualActiveSetStatus.Optimal || StationarityPerMwh <= StationaryShare * _stationaryScale)
                return status;
            MoveCentre();
        }

        var last = SolveStep();
        return last == DualActiveSetStatus.Optimal && StationarityPerMwh > AcceptableShare * _stationaryScale
            ? DualActiveSetStatus.StepLimit
            : last;
    }

    /// <summary>One proximal step. A head start that rounding has spoilt is not worth keeping; then it is solved without.</summary>
    private DualActiveSetStatus SolveStep()
    {
        for (var j = 0; j < _linear.Length; j++)
            _linear[j] = _cost[j] - (_proximal[j] * _centre[j]);
        var status = _solver.Solve(_linear, _lower, _upper, _x, _multipliers);
        if (status == DualActiveSetStatus.StepLimit)
        {
            _solver.Forget();
            status = _solver.Solve(_linear, _lower, _upper, _x, _multipliers);
        }

        StationarityPerMwh = 0;
        for (var j = 0; j < _x.Length; j++)
            StationarityPerMwh = Math.Max(StationarityPerMwh, _proximal[j] * Math.Abs(_x[j] - _centre[j]));
        SetPrices();
        return status;
    }

    private void SetCurvature(double largestSusceptance)
    {
        for (var j = 0; j < _angles; j++)
        {
            if (j < _weight.Length)
                _curvature[j] = _weight[j];
            else
                _proximal[j] = ProximalShare * _priceScale * largestSusceptance;
        }

        var finite = _units.Where(unit => double.IsFinite(unit.MaxMw - unit.MinMw)).Select(unit => unit.MaxMw - unit.MinMw);
        var commonRangeMw = Math.Max(1, finite.Sum());
        for (var u = 0; u < _units.Count; u++)
        {
            var rangeMw = _units[u].MaxMw - _units[u].MinMw;
            var isFinite = double.IsFinite(rangeMw);
            var j = _angles + u;
            var proximal = ProximalShare * _priceScale / (isFinite ? rangeMw : commonRangeMw);
            _curvature[j] = 2 * _units[u].CostQuadratic;
            _proximal[j] = _curvature[j] < proximal ? proximal : 0;
            _startCentre[j] = isFinite ? _units[u].MinMw + (0.5 * rangeMw) : 0;
            _cost[j] = _units[u].CostLinear;
        }
    }

    private void SetBounds(ReadOnlySpan<double> netLoadMw)
    {
        for (var i = 0; i < _lower.Length; i++)
        {
            var shift = DenseKernels.Dot(netLoadMw, _loadShares.AsSpan(i * _own, _own));
            _lower[i] = _lowerBase[i] + shift;
            _upper[i] = _upperBase[i] + shift;
        }
    }

    /// <summary>The price of a bus is what its load's next MW costs: Σ multiplier_i · ∂bound_i/∂load.</summary>
    private void SetPrices()
    {
        Array.Clear(_pricePerMwh);
        for (var i = 0; i < _multipliers.Length; i++)
            DenseKernels.AddScaled(_pricePerMwh, _multipliers[i], _loadShares.AsSpan(i * _own, _own));
    }

    /// <summary>
    /// Inside one face of the feasible set a proximal step is a step of the gradient method preconditioned by H + σ, so
    /// conjugate directions D = (x − c) + β·D_before end in a few steps where plain ones would creep. The centre goes to
    /// the minimum of the true cost along D within the rows; where that is no better than x, along x − c instead.
    /// </summary>
    private void MoveCentre()
    {
        if (OuterSteps == 1)
        {
            // The first centre need not meet the rows, so there is no direction to speak of yet.
            _x.CopyTo(_centre, 0);
            Array.Clear(_direction);
            return;
        }

        double cross = 0, before = 0;
        for (var j = 0; j < _x.Length; j++)
        {
            _step[j] = _x[j] - _centre[j];
            cross += _step[j] * _curvature[j] * _direction[j];
            before += _direction[j] * _curvature[j] * _direction[j];
        }

        var beta = before > 0 ? -cross / before : 0;
        for (var j = 0; j < _x.Length; j++)
            _direction[j] = _step[j] + (beta * _direction[j]);
        var (reach, gain) = SearchAlong(_direction);
        var (plainReach, plainGain) = SearchAlong(_step);
        if (!(gain > plainGain))
        {
            reach = plainReach;
            _step.CopyTo(_direction, 0);
        }

        if (reach > 0)
            DenseKernels.AddScaled(_centre, reach, _direction);
        else
            _x.CopyTo(_centre, 0);
    }

    /// <summary>Exact line search of the true cost from the centre within the rows: how far, and what it saves, $/h.</summary>
    private (double Reach, double Gain) SearchAlong(double[] direction)
    {
        double slope = 0, curvature = 0;
        for (var j = 0; j < direction.Length; j++)
        {
            slope += direction[j] * (_cost[j] + (_curvature[j] * _centre[j]));
            curvature += _curvature[j] * direction[j] * direction[j];
        }

        if (!(slope < 0))
            return (0, 0);
        var reach = curvature > 0 ? -slope / curvature : double.MaxValue;
        for (var i = 0; i < _lower.Length; i++)
        {
            var row = _rows.AsSpan(i * direction.Length, direction.Length);
            var change = DenseKernels.Dot(row, direction);
            var value = DenseKernels.Dot(row, _centre);
            if (Math.Abs(change) > 1e-10 * (1 + Math.Abs(value)))
                reach = Math.Min(reach, Math.Max(0, ((change > 0 ? _upper[i] : _lower[i]) - value) / change));
        }

        return reach < 1e9 ? (reach, -reach * (slope + (0.5 * reach * curvature))) : (0, 0);
    }
}
