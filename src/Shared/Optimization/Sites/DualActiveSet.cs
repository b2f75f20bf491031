namespace Halfvoice.Optimization;

/// <summary>
/// Dense strictly convex quadratic programs by the dual active-set method of Goldfarb and Idnani (1983, from memory):
/// <code>
/// min ½ xᵀ H x + gᵀ x   s.t.   lower_i ≤ a_i · x ≤ upper_i,   the first rows being equalities (lower_i = upper_i).
/// </code>
/// H and the rows a_i are fixed; g and the bounds change from call to call. The factor and the active rows of the last
/// call are kept: a call starts at the minimum over those rows, drops the rows that no longer press, and then adds
/// violated rows one by one. Between calls nothing but that head start is remembered, and steady use allocates nothing.
/// Not safe for concurrent use.
/// </summary>
public sealed class DualActiveSet
{
    /// <summary>A row counts as violated beyond this share of the sizes of the terms that make it up.</summary>
    private const double RowTolerance = 1e-11;

    /// <summary>A row counts as dependent on the active ones when less than this share of its normal is new.</summary>
    private const double DependentShare = 1e-11;

    /// <summary>After so many changes the factor is built afresh, so that rounding cannot pile up over many rounds.</summary>
    private const int ChangesMax = 300;

    private readonly int _n;
    private readonly int _rowCount;
    private readonly int _equalities;
    private readonly ActiveFactor _factor;
    private readonly double[] _inverseNorm;
    private readonly bool[] _isActive;
    private readonly int[] _kept;
    private readonly int[] _keptSign;
    private readonly double[] _gradient;
    private readonly double[] _x;
    private readonly double[] _multiplier;
    private readonly double[] _d;
    private readonly double[] _r;
    private readonly double[] _z;
    private int _permanent;

    /// <summary>Factors the Hessian and activates the equalities.</summary>
    /// <param name="hessian">H, n × n by rows, symmetric positive definite; the lower triangle is read.</param>
    /// <param name="variables">n, at least 1.</param>
    /// <param name="rows">The a_i, each of length n, one after the other.</param>
    /// <param name="equalities">How many of the first rows are equalities.</param>
    /// <exception cref="ArgumentException">A length does not fit, or H is not positive definite.</exception>
    public DualActiveSet(ReadOnlySpan<double> hessian, int variables, ReadOnlySpan<double> rows, int equalities)
    {
        if (variables < 1 || hessian.Length != variables * variables)
            throw new ArgumentException("The Hessian must be square with at least one variable.", nameof(hessian));
        if (rows.Length % variables != 0)
            throw new ArgumentException("Every row needs one coefficient per variable.", nameof(rows));
        _n = variables;
        _rowCount = rows.Length / variables;
        if (equalities < 0 || equalities > _rowCount)
            throw new ArgumentException("There cannot be more equalities than rows.", nameof(equalities));
        _equalities = equalities;
        _factor = new ActiveFactor(hessian, variables, rows.ToArray());
        _inverseNorm = new double[_rowCount];
        _isActive = new bool[_rowCount];
        _kept = new int[variables];
        _keptSign = new int[variables];
        _gradient = new double[variables];
        _x = new double[variables];
        _multiplier = new double[variables + 1];
        _d = new double[variables];
        _r = new double[variables];
        _z = new double[variables];
        for (var i = 0; i < _rowCount; i++)
        {
            _factor.Project(_factor.Row(i), 1, _d);
            var norm = Math.Sqrt(DenseKernels.Dot(_d, _d));
            _inverseNorm[i] = norm > 0 ? 1 / norm : 1;
        }

        Rebuild(keepInequalities: false);
    }

    /// <summary>Number of rows.</summary>
    public int RowCount => _rowCount;

    /// <summary>Rows added in the last solve after its head start: a measure of work.</summary>
    public int LastSteps { get; private set; }

    /// <summary>Forgets the head start, so that the next solve begins with the equalities alone.</summary>
    public void Forget() => Rebuild(keepInequalities: false);

    /// <summary>Solves for one linear term and one set of bounds.</summary>
    /// <param name="linear">g.</param>
    /// <param name="lower">Per row; negative infinity for none.</param>
    /// <param name="upper">Per row, at least <paramref name="lower"/>; positive infinity for none.</param>
    /// <param name="x">Receives the point; meaningful when the status is optimal.</param>
    /// <param name="multipliers">Receives one multiplier per row: H x + g = Σ multiplier_i a_i, positive where the lower
    /// bound presses, negative where the upper does, of any sign for an equality.</param>
    /// <exception cref="ArgumentException">A span has the wrong length.</exception>
    public DualActiveSetStatus Solve(
        ReadOnlySpan<double> linear, ReadOnlySpan<double> lower, ReadOnlySpan<double> upper, Span<double> x, Span<double> multipliers)
    {
        if (linear.Length != _n || x.Length != _n)
            throw new ArgumentException($"The problem has {_n} variables; the linear term or the point is not as long.");
        if (lower.Length != _rowCount || upper.Length != _rowCount || multipliers.Length != _rowCount)
            throw new ArgumentException($"The problem has {_rowCount} rows; bounds or multipliers are not as many.");
        if (_factor.Changes > ChangesMax)
            Rebuild(keepInequalities: true);
        HeadStart(linear, lower, upper);
        var status = AddViolated(linear, lower, upper);
        _x.CopyTo(x);
        multipliers.Clear();
        for (var k = 0; k < _factor.Count; k++)
            multipliers[_factor.Active[k]] = _factor.Sign[k] * (k < _permanent ? _multiplier[k] : Math.Max(_multiplier[k], 0));
        return status;
    }

    /// <summary>The minimum over the rows still active, without those whose multiplier has turned.</summary>
    private void HeadStart(ReadOnlySpan<double> linear, ReadOnlySpan<double> lower, ReadOnlySpan<double> upper)
    {
        for (var k = _factor.Count - 1; k >= _permanent; k--)
        {
            // A bound may have become infinite since the last call; then there is nothing to press against.
            if (!double.IsFinite(BoundOf(k, lower, upper)))
                DropAt(k);
        }

        while (true)
        {
            ComputePoint(linear, lower, upper);
            var before = _factor.Count;
            for (var k = _factor.Count - 1; k >= _permanent; k--)
            {
                if (_multiplier[k] < 0)
                    DropAt(k);
            }

            if (_factor.Count == before)
                return;
        }
    }

    private DualActiveSetStatus AddViolated(ReadOnlySpan<double> linear, ReadOnlySpan<double> lower, ReadOnlySpan<double> upper)
    {
        var stepsMax = 100 + (20 * (_n + _rowCount));
        var fresh = true;
        for (LastSteps = 0; LastSteps < stepsMax; LastSteps++)
        {
            var (row, sign) = MostViolated(lower, upper);
            if (row < 0 && fresh)
                return DualActiveSetStatus.Optimal;
            if (row < 0)
            {
                // The point came about by steps; computed from its active rows at once it carries less rounding.
                HeadStart(linear, lower, upper);
                fresh = true;
                continue;
            }

            fresh = false;
            if (!Activate(row, sign, lower, upper))
                return DualActiveSetStatus.Infeasible;
        }

        return DualActiveSetStatus.StepLimit;
    }

    /// <summary>
    /// Moves to the minimum over the active rows and a violated one, dropping active rows whose multiplier would turn
    /// on the way. Returns false when the row cannot be met together with the others.
    /// </summary>
    private bool Activate(int row, int sign, ReadOnlySpan<double> lower, ReadOnlySpan<double> upper)
    {
        var normal = _factor.Row(row);
        var bound = sign > 0 ? lower[row] : upper[row];
        var added = 0.0;
        while (true)
        {
            _factor.Project(normal, sign, _d);
            var count = _factor.Count;
            _d.AsSpan(0, count).CopyTo(_r);
            _factor.SolveTriangle(_r);
            var fresh = _d.AsSpan(count);
            var curvature = DenseKernels.Dot(fresh, fresh);
            var dependent = curvature * _inverseNorm[row] * _inverseNorm[row] <= DependentShare * DependentShare;
            var missing = sign * (bound - DenseKernels.Dot(normal, _x));
            var fullStep = dependent ? double.PositiveInfinity : Math.Max(missing, 0) / curvature;
            var (partialStep, leaving) = LongestDualStep();
            var step = Math.Min(fullStep, partialStep);
            if (double.IsPositiveInfinity(step))
                return false;
            DenseKernels.AddScaled(_multiplier, -step, _r.AsSpan(0, count));
            added += step;
            if (!dependent)
            {
                _factor.Combine(_d, count, _z);
                DenseKernels.AddScaled(_x, step, _z);
            }

            if (fullStep <= partialStep)
            {
                _factor.Add(row, sign, _d);
                _multiplier[count] = added;
                _isActive[row] = true;
                return true;
            }

            DropAt(leaving);
        }
    }

    private (double Step, int Position) LongestDualStep()
    {
        var step = double.PositiveInfinity;
        var position = -1;
        for (var k = _permanent; k < _factor.Count; k++)
        {
            if (_r[k] > 0 && _multiplier[k] < step * _r[k])
            {
                step = Math.Max(_multiplier[k], 0) / _r[k];
                position = k;
            }
        }

        return (step, position);
    }

    /// <summary>The row violated most in the metric of the Hessian, and the side; (−1, 0) when all are met.</summary>
    private (int Row, int Sign) MostViolated(ReadOnlySpan<double> lower, ReadOnlySpan<double> upper)
    {
        var worst = 0.0;
        var found = (-1, 0);
        for (var i = 0; i < _rowCount; i++)
        {
            if (_isActive[i])
                continue;
            var value = DenseKernels.Dot(_factor.Row(i), _x);
            var below = lower[i] - value;
            var above = value - upper[i];
            var violation = Math.Max(below, above);
            if (!(violation * _inverseNorm[i] > worst))
                continue;
            var sign = below > above ? 1 : -1;
            if (violation <= RowTolerance * (Math.Abs(sign > 0 ? lower[i] : upper[i]) + SizeOf(i)))
                continue;
            worst = violation * _inverseNorm[i];
            found = (i, sign);
        }

        return found;
    }

    private double SizeOf(int row)
    {
        var normal = _factor.Row(row);
        var size = 0.0;
        for (var j = 0; j < normal.Length; j++)
            size += Math.Abs(normal[j] * _x[j]);
        return size;
    }

    /// <summary>
    /// With v = J⁻¹ x the active rows say Rᵀ v_1 = bounds, stationarity says v_2 = −(Jᵀ g)_2, and the multipliers are
    /// R⁻¹ (v_1 + (Jᵀ g)_1).
    /// </summary>
    private void ComputePoint(ReadOnlySpan<double> linear, ReadOnlySpan<double> lower, ReadOnlySpan<double> upper)
    {
        var count = _factor.Count;
        _factor.Project(linear, 1, _gradient);
        for (var k = 0; k < count; k++)
            _d[k] = _factor.Sign[k] * BoundOf(k, lower, upper);
        _factor.SolveTransposed(_d);
        for (var k = count; k < _n; k++)
            _d[k] = -_gradient[k];
        _factor.Combine(_d, 0, _x);
        for (var k = 0; k < count; k++)
            _multiplier[k] = _d[k] + _gradient[k];
        _factor.SolveTriangle(_multiplier);
    }

    private double BoundOf(int position, ReadOnlySpan<double> lower, ReadOnlySpan<double> upper)
    {
        var row = _factor.Active[position];
        return _factor.Sign[position] > 0 ? lower[row] : upper[row];
    }

    private void DropAt(int position)
    {
        _isActive[_factor.Active[position]] = false;
        for (var k = position; k + 1 < _factor.Count; k++)
            _multiplier[k] = _multiplier[k + 1];
        _factor.Drop(position);
    }

    /// <summary>Builds the factor from scratch; dependent rows are left out, and the search for violated rows watches them.</summary>
    private void Rebuild(bool keepInequalities)
    {
        var kept = keepInequalities ? _factor.Count - _permanent : 0;
        _factor.Active.Slice(_permanent, kept).CopyTo(_kept);
        _factor.Sign.Slice(_permanent, kept).CopyTo(_keptSign);
        _factor.Clear();
        Array.Clear(_isActive);
        for (var i = 0; i < _equalities; i++)
            AddIfIndependent(i, 1);
        _permanent = _factor.Count;
        for (var k = 0; k < kept; k++)
            AddIfIndependent(_kept[k], _keptSign[k]);
    }

    private void AddIfIndependent(int row, int sign)
    {
        _factor.Project(_factor.Row(row), sign, _d);
        var fresh = _d.AsSpan(_factor.Count);
        if (DenseKernels.Dot(fresh, fresh) * _inverseNorm[row] * _inverseNorm[row] <= DependentShare * DependentShare)
            return;
        _factor.Add(row, sign, _d);
        _isActive[row] = true;
    }
}
