using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>DC power flow: B θ = injections, flow = b (θ_from − θ_to). The factor is kept. Not thread-safe.</summary>
public sealed class PowerFlow
{
    private readonly GridGraph _grid;
    private readonly SusceptanceSystem _system;
    private readonly double[] _injection;
    private readonly double[] _angle;
    private readonly double[] _surplus;

    /// <exception cref="ArgumentException">A line has no usable reactance.</exception>
    public PowerFlow(Network network)
    {
        _grid = new GridGraph(network);
        _system = new SusceptanceSystem(_grid);
        Islands = Grid.Islands.Of(network);
        _injection = new double[_grid.BusCount];
        _angle = new double[_grid.BusCount];
        _surplus = new double[_grid.IslandCount];
    }

    /// <summary>Buses of each island.</summary>
    public IReadOnlyList<int[]> Islands { get; }

    /// <summary>Flows by line, MW.</summary>
    /// <param name="injectionMw">Net injection by bus, MW; what an island is out of balance is made up at its first bus.</param>
    public double[] FlowMw(ReadOnlySpan<double> injectionMw)
    {
        injectionMw.CopyTo(_injection);
        Array.Clear(_surplus);
        for (var b = 0; b < _injection.Length; b++)
            _surplus[_grid.IslandOf[b]] += _injection[b];
        for (var i = 0; i < _surplus.Length; i++)
            _injection[_grid.ReferenceBus[i]] -= _surplus[i];
        _system.Solve(_injection, _angle);
        var flows = new double[_grid.LineCount];
        for (var l = 0; l < flows.Length; l++)
            flows[l] = _grid.SusceptanceMwPerRad[l] * (_angle[_grid.From[l]] - _angle[_grid.To[l]]);
        return flows;
    }

    /// <summary>
    /// Change of one line's flow, MW per MW injected at each bus and taken out at the first bus of its island; zero in other
    /// islands. B is symmetric, so b (e_from − e_to)ᵀ B⁻¹ is the transpose of one solve: B s = b (e_from − e_to).
    /// </summary>
    /// <param name="line">Index of the line.</param>
    public double[] Sensitivity(int line)
    {
        Array.Clear(_injection);
        _injection[_grid.From[line]] = _grid.SusceptanceMwPerRad[line];
        _injection[_grid.To[line]] = -_grid.SusceptanceMwPerRad[line];
        var sensitivity = new double[_grid.BusCount];
        _system.Solve(_injection, sensitivity);
        return sensitivity;
    }
}
