using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>
/// DC power flow: B θ = injections with the first bus of each island at angle 0, flow = b (θ_from − θ_to). The factor is
/// kept; one step of iterative refinement covers the shifted pivots that negative reactances can bring. Not thread-safe.
/// </summary>
public sealed class PowerFlow
{
    private readonly GridGraph _grid;
    private readonly SparseLdl _factor;
    private readonly double[] _diagonal;
    private readonly bool[] _isReference;
    private readonly double[] _angle;
    private readonly double[] _rest;
    private readonly double[] _work;

    /// <exception cref="ArgumentException">A line has no usable reactance.</exception>
    public PowerFlow(Network network)
    {
        _grid = new GridGraph(network);
        Islands = Grid.Islands.Of(network);
        _isReference = new bool[_grid.BusCount];
        foreach (var bus in _grid.ReferenceBus)
            _isReference[bus] = true;
        _diagonal = new double[_grid.BusCount];
        var edge = new double[_grid.EdgeA.Length];
        for (var l = 0; l < _grid.LineCount; l++)
        {
            var b = _grid.SusceptanceMwPerRad[l];
            _diagonal[_grid.From[l]] += b;
            _diagonal[_grid.To[l]] += b;
            if (!_isReference[_grid.From[l]] && !_isReference[_grid.To[l]])
                edge[_grid.EdgeOfLine[l]] -= b;
        }

        foreach (var bus in _grid.ReferenceBus)
            _diagonal[bus] = 1;
        _factor = new SparseLdl(_grid.Pattern);
        _factor.Factor(_diagonal, edge);
        _angle = new double[_grid.BusCount];
        _rest = new double[_grid.BusCount];
        _work = new double[_grid.BusCount];
    }

    /// <summary>Buses of each island.</summary>
    public IReadOnlyList<int[]> Islands { get; }

    /// <summary>Flows by line, MW.</summary>
    /// <param name="injectionMw">Net injection by bus, MW; each island must balance, what it lacks is taken at its first bus.</param>
    public double[] FlowMw(ReadOnlySpan<double> injectionMw)
    {
        if (injectionMw.Length != _grid.BusCount)
            throw new ArgumentException("Injections go by bus.", nameof(injectionMw));
        Array.Clear(_angle);
        for (var pass = 0; pass < 3; pass++)
        {
            injectionMw.CopyTo(_rest);
            for (var l = 0; l < _grid.LineCount; l++)
            {
                var flow = _grid.SusceptanceMwPerRad[l] * (_angle[_grid.From[l]] - _angle[_grid.To[l]]);
                _rest[_grid.From[l]] -= flow;
                _rest[_grid.To[l]] += flow;
            }

            foreach (var bus in _grid.ReferenceBus)
                _rest[bus] = 0;
            _factor.Solve(_rest, _work);
            for (var b = 0; b < _angle.Length; b++)
                _angle[b] += _rest[b];
        }

        var flows = new double[_grid.LineCount];
        for (var l = 0; l < flows.Length; l++)
            flows[l] = _grid.SusceptanceMwPerRad[l] * (_angle[_grid.From[l]] - _angle[_grid.To[l]]);
        return flows;
    }
}
