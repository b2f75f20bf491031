using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Coordination;

/// <summary>
/// Scheme injection: the consensus z is the projection of x̂ + u/ρ, in the metric ρ, on the injections that the network can
/// carry: Σ z = 0 and |H z| ≤ limit, with buses that cannot move held at what they released.
/// </summary>
public sealed class InjectionCoordinator : CoordinatorScheme
{
    private readonly NetworkProjection _projection;
    private readonly int[] _busOf;
    private readonly double[] _wishByBus;
    private readonly double[] _consensusByBus;

    public InjectionCoordinator(CoordinatorSetup setup)
        : base(setup)
    {
        var network = PublicNetwork(setup);
        var index = setup.Buses.Select((bus, i) => (bus.Name, i)).ToDictionary(pair => pair.Name, pair => pair.i, StringComparer.Ordinal);
        _busOf = Map.Components.Select(part => index[part.Bus]).ToArray();
        var penalty = new double[setup.Buses.Count];
        var free = new bool[setup.Buses.Count];
        for (var k = 0; k < Map.Count; k++)
        {
            penalty[_busOf[k]] = Map.Penalty[k];
            free[_busOf[k]] = Map.Adjustable[k];
        }

        _projection = new NetworkProjection(network, penalty, free, setup.PriceScalePerMwh);
        _wishByBus = new double[penalty.Length];
        _consensusByBus = new double[penalty.Length];
    }

    protected override void FindConsensus(ReadOnlySpan<double> wish, Span<double> consensus)
    {
        for (var k = 0; k < wish.Length; k++)
            _wishByBus[_busOf[k]] = wish[k];
        UnservedMw = _projection.Project(_wishByBus, _consensusByBus).UnservedMw;
        for (var k = 0; k < wish.Length; k++)
            consensus[k] = _consensusByBus[_busOf[k]];
    }

    private static Network PublicNetwork(CoordinatorSetup setup)
    {
        var site = new Dictionary<string, string>(StringComparer.Ordinal);
        foreach (var owner in setup.Sites)
        {
            foreach (var part in owner.Components)
                site[part.Bus] = owner.Name;
        }

        return new Network(
            setup.BaseMva,
            setup.Buses.Select(bus => new Bus(bus.Name, site[bus.Name])).ToArray(),
            setup.Lines.Select(l => new Line(l.Name, l.FromBus, l.ToBus, l.ReactancePu, l.LimitMw ?? double.PositiveInfinity)).ToArray(),
            []);
    }
}
