namespace Halfvoice.Coordination;

/// <summary>
/// Scheme angle: the consensus angle of a bus is the weighted mean of its copies, θ̄ = Σ w (x̂ + λ/w) / Σ w; then
/// λ ← λ + w (x̂ − θ̄). The coordinator sees border buses only.
/// </summary>
public sealed class AngleCoordinator : CoordinatorScheme
{
    private readonly int[] _busOf;
    private readonly double[] _weightOfBus;
    private readonly double[] _sum;

    public AngleCoordinator(CoordinatorSetup setup)
        : base(setup)
    {
        var index = new Dictionary<string, int>(StringComparer.Ordinal);
        _busOf = new int[Map.Count];
        for (var k = 0; k < Map.Count; k++)
        {
            var name = Map.Components[k].Bus;
            if (!index.TryGetValue(name, out var bus))
            {
                bus = index.Count;
                index.Add(name, bus);
            }

            _busOf[k] = bus;
        }

        _weightOfBus = new double[index.Count];
        _sum = new double[index.Count];
        for (var k = 0; k < Map.Count; k++)
            _weightOfBus[_busOf[k]] += Map.Penalty[k];
    }

    protected override void FindConsensus(ReadOnlySpan<double> wish, Span<double> consensus)
    {
        Array.Clear(_sum);
        for (var k = 0; k < wish.Length; k++)
            _sum[_busOf[k]] += Map.Penalty[k] * wish[k];
        for (var k = 0; k < wish.Length; k++)
            consensus[k] = _sum[_busOf[k]] / _weightOfBus[_busOf[k]];
    }
}
