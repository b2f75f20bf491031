using Halfvoice.Optimization;

namespace Halfvoice.Coordination;

/// <summary>
/// Scheme injection at a site: for each own bus x = argmin c(p) + u x + ρ/2 (x − z)², x = p − d. The buses of a site do not
/// meet in this problem, so each is solved on its own. A bus without range answers p_min − d.
/// </summary>
public sealed class InjectionSite : ISiteScheme
{
    private readonly SiteSetup _setup;
    private readonly SupplyCurve[] _supply;
    private readonly int[][] _generatorsOf;
    private readonly double[] _split;

    public InjectionSite(SiteSetup setup)
    {
        _setup = setup;
        _generatorsOf = SiteGenerators.ByBus(setup);
        _supply = Array.ConvertAll(_generatorsOf, own => new SupplyCurve(SiteGenerators.Of(setup, own)));
        _split = new double[setup.Generators.Count];
        Adjustable = Enumerable.Range(0, setup.Buses.Count).Where(b => setup.Buses[b].PenaltyPerMw2h > 0).ToArray();
    }

    public int ComponentCount => _setup.Buses.Count;

    public IReadOnlyList<int> Adjustable { get; }

    public double Bound => _setup.Buses[0].BoundMw;

    public void Solve(ReadOnlySpan<double> loadMw, Ask ask, Span<double> values)
    {
        for (var bus = 0; bus < values.Length; bus++)
            values[bus] = _supply[bus].MinMw - loadMw[bus];
        for (var i = 0; i < Adjustable.Count; i++)
        {
            var bus = Adjustable[i];
            values[bus] = InjectionProblem.Solve(_supply[bus], ask.Consensus[i], ask.Dual[i], _setup.Buses[bus].PenaltyPerMw2h, loadMw[bus]);
        }
    }

    /// <summary>Total output of a bus: clip(z + d, min, max), shared out in merit order.</summary>
    public void Dispatch(ReadOnlySpan<double> loadMw, Outcome outcome, Span<double> outputMw)
    {
        for (var bus = 0; bus < _supply.Length; bus++)
        {
            var own = _generatorsOf[bus];
            var shares = _split.AsSpan(0, own.Length);
            _supply[bus].Split(outcome.Consensus[bus] + loadMw[bus], shares);
            for (var i = 0; i < own.Length; i++)
                outputMw[own[i]] = shares[i];
        }
    }
}
