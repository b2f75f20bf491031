using Halfvoice.Optimization;

namespace Halfvoice.Coordination;

/// <summary>
/// Scheme angle at a site: copies of the angles of its own border buses and of the foreign buses they touch, moved to
/// a = θ̄ − λ/w as far as loads, plants and lines allow. One bus is solved by its breakpoints, several by a dual active-set
/// method.
/// </summary>
public sealed class AngleSite : ISiteScheme
{
    // At the end of a cycle the copies are held at the consensus this many times as hard; plants follow.
    private const double HoldFactor = 1e3;

    // An ask may be chosen to break the solver, and whether it does could depend on the loads. Anchors are therefore cut at a
    // public bound, four times that of the answers; the sensitivity holds for every anchor, so for the cut ones too.
    private const double AnchorBoundRad = 4 * SetupBuilder.AngleBoundRad;

    private readonly SiteSetup _setup;
    private readonly NodalAngleProblem? _nodal;
    private readonly SupplyCurve? _supply;
    private readonly AreaAngleProblem? _area;
    private readonly AreaAngleProblem? _held;
    private readonly double[] _anchor;
    private readonly double[] _copies;
    private readonly double[] _outputs;

    public AngleSite(SiteSetup setup)
    {
        _setup = setup;
        ComponentCount = setup.Copies.Count;
        Adjustable = Enumerable.Range(0, ComponentCount).ToArray();
        _anchor = new double[ComponentCount];
        _copies = new double[ComponentCount];
        _outputs = new double[setup.Generators.Count];
        if (setup.Buses.Count == 1 && ComponentCount > 0)
        {
            _supply = new SupplyCurve(SiteGenerators.Of(setup, Enumerable.Range(0, setup.Generators.Count)));
            _nodal = new NodalAngleProblem(_supply, setup.Copies.Select(copy => copy.WeightPerRad2h).ToArray(), NodalLines(), setup.UnservedPricePerMwh);
        }
        else
        {
            _area = new AreaAngleProblem(Area(1));
            _held = new AreaAngleProblem(Area(HoldFactor));
        }
    }

    public int ComponentCount { get; }

    public IReadOnlyList<int> Adjustable { get; }

    public double Bound => SetupBuilder.AngleBoundRad;

    public void Solve(ReadOnlySpan<double> loadMw, Ask ask, Span<double> values)
    {
        PlaceAnchors(ask.Consensus, ask.Dual, 1);
        if (_nodal is not null)
            _nodal.Solve(loadMw[0], _anchor, values);
        else
            _area!.Solve(loadMw, _anchor, values, _outputs);
    }

    /// <summary>
    /// One bus: what the consensus angles carry away, plus the load, within the plants' limits and in merit order. Several
    /// buses: the dispatch that the last prices λ call for, with the copies held at the consensus as nearly as lines and plants
    /// allow; at the end of a settled cycle this is what the site answered.
    /// </summary>
    public void Dispatch(ReadOnlySpan<double> loadMw, Outcome outcome, Span<double> outputMw)
    {
        if (_nodal is null)
        {
            PlaceAnchors(outcome.Consensus, outcome.Dual, HoldFactor);
            _held!.Solve(loadMw, _anchor, _copies, outputMw);
            return;
        }

        var away = 0.0;
        foreach (var line in NodalLines())
            away += line.SusceptanceMwPerRad * (Cut(outcome.Consensus[0]) - Cut(outcome.Consensus[line.Copy]));
        _supply!.Split(away + loadMw[0], outputMw);
    }

    private void PlaceAnchors(double[] consensus, double[] dual, double factor)
    {
        for (var c = 0; c < _anchor.Length; c++)
            _anchor[c] = Cut(consensus[c] - (dual[c] / (factor * _setup.Copies[c].WeightPerRad2h)));
    }

    private static double Cut(double angleRad) => Math.Clamp(angleRad, -AnchorBoundRad, AnchorBoundRad);

    /// <summary>Lines as seen from the one own bus, local node 0; copies come in the order of local nodes.</summary>
    private NodalLine[] NodalLines() => _setup.Lines
        .Select(line => new NodalLine(line.FromNode == 0 ? line.ToNode : line.FromNode, line.SusceptanceMwPerRad, line.LimitMw ?? double.PositiveInfinity))
        .ToArray();

    private AreaModel Area(double factor) => new(
        _setup.Buses.Count,
        SiteGenerators.Of(_setup, Enumerable.Range(0, _setup.Generators.Count)),
        _setup.Lines.Select(l => new AreaLine(l.FromNode, l.ToNode, l.SusceptanceMwPerRad, l.LimitMw ?? double.PositiveInfinity)).ToArray(),
        _setup.Copies.Select(copy => copy.Node).ToArray(),
        _setup.Copies.Select(copy => factor * copy.WeightPerRad2h).ToArray(),
        _setup.UnservedPricePerMwh);
}
