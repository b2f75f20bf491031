namespace Halfvoice.Optimization;

/// <summary>
/// The rows of an area's quadratic program in its variables (angles, then outputs): left-over balances first, then
/// line limits, then output limits. A row depends on the net loads as well: lower ≤ a·x − s·load ≤ upper.
/// </summary>
internal sealed class AreaRows
{
    /// <summary>Coefficients below this share of their natural size are rounding of an exact 0.</summary>
    private const double ZeroShare = 1e-12;

    private readonly AreaReduction _reduction;
    private readonly IReadOnlyList<AreaUnit> _units;
    private readonly int _own;
    private readonly List<double[]> _coefficients = [];
    private readonly List<double[]> _loadShares = [];
    private readonly List<double> _lower = [];
    private readonly List<double> _upper = [];

    public AreaRows(AreaModel model, AreaReduction reduction, IReadOnlyList<AreaUnit> units)
    {
        _reduction = reduction;
        _units = units;
        _own = model.OwnBusCount;
        var angles = new double[reduction.AngleCount];
        var injections = new double[_own];
        for (var e = 0; e < reduction.EquationCount; e++)
        {
            reduction.Equation(e, angles, injections);
            Add(angles, injections, 0, 0);
        }

        foreach (var corridor in model.Lines.GroupBy(line => (Math.Min(line.From, line.To), Math.Max(line.From, line.To))))
            AddCorridor(corridor.Key.Item1, corridor.Key.Item2, corridor);
        for (var u = 0; u < units.Count; u++)
        {
            var row = new double[VariableCount];
            row[reduction.AngleCount + u] = 1;
            _coefficients.Add(row);
            _loadShares.Add(new double[_own]);
            _lower.Add(units[u].MinMw);
            _upper.Add(units[u].MaxMw);
        }
    }

    public int VariableCount => _reduction.AngleCount + _units.Count;

    public double[] Coefficients => _coefficients.SelectMany(row => row).ToArray();

    public double[] LoadShares => _loadShares.SelectMany(row => row).ToArray();

    public double[] Lower => [.. _lower];

    public double[] Upper => [.. _upper];

    /// <summary>Parallel lines share one angle difference, so the one that reaches its limit first stands for all.</summary>
    private void AddCorridor(int from, int to, IEnumerable<AreaLine> lines)
    {
        var first = lines.MinBy(line => line.LimitMw / Math.Abs(line.SusceptanceMwPerRad));
        if (double.IsPositiveInfinity(first.LimitMw))
            return;
        var angles = new double[_reduction.AngleCount];
        var injections = new double[_own];
        var otherAngles = new double[_reduction.AngleCount];
        var otherInjections = new double[_own];
        _reduction.Angle(from, angles, injections);
        _reduction.Angle(to, otherAngles, otherInjections);
        for (var a = 0; a < angles.Length; a++)
            angles[a] = first.SusceptanceMwPerRad * (angles[a] - otherAngles[a]);
        for (var b = 0; b < injections.Length; b++)
            injections[b] = first.SusceptanceMwPerRad * (injections[b] - otherInjections[b]);
        Add(angles, injections, -first.LimitMw, first.LimitMw);
    }

    private void Add(double[] angles, double[] injections, double lower, double upper)
    {
        var row = new double[VariableCount];
        for (var a = 0; a < angles.Length; a++)
            row[a] = Math.Abs(angles[a]) > ZeroShare * _reduction.LargestSusceptance ? angles[a] : 0;
        var shares = injections.Select(share => Math.Abs(share) > ZeroShare ? share : 0).ToArray();
        for (var u = 0; u < _units.Count; u++)
            row[angles.Length + u] = shares[_units[u].Bus];
        _coefficients.Add(row);
        _loadShares.Add(shares);
        _lower.Add(lower);
        _upper.Add(upper);
    }
}
