namespace Halfvoice.Optimization;

/// <summary>
/// Angles from injections: B θ = x with B = Aᵀ diag(b) A, every island's first bus at angle 0. Factored once.
/// </summary>
/// <remarks>
/// A susceptance is added to B at every reference bus, of the sign that B has there so that they cannot
/// cancel. Where the injections of an island sum to zero this changes nothing: summing the island's rows leaves that
/// susceptance times the reference angle equal to zero. Negative reactances can make B indefinite;
/// every solution is then refined against B itself.
/// </remarks>
internal sealed class SusceptanceSystem
{
    private const int MaxRefinements = 12;

    private readonly GridGraph _graph;
    private readonly SparseLdl _factor;
    private readonly bool _refine;
    private readonly double[] _ground;
    private readonly double[] _residual;
    private readonly double[] _work;
    private readonly double[] _edge;

    public SusceptanceSystem(GridGraph graph)
    {
        _graph = graph;
        _factor = new SparseLdl(graph.Pattern);
        _residual = new double[graph.BusCount];
        _work = new double[graph.BusCount];
        _edge = new double[graph.EdgeA.Length];
        var diagonal = new double[graph.BusCount];
        var rowSize = new double[graph.BusCount];
        for (var l = 0; l < graph.LineCount; l++)
        {
            var b = graph.SusceptanceMwPerRad[l];
            diagonal[graph.From[l]] += b;
            diagonal[graph.To[l]] += b;
            _edge[graph.EdgeOfLine[l]] -= b;
            rowSize[graph.From[l]] += Math.Abs(b);
            rowSize[graph.To[l]] += Math.Abs(b);
            _refine |= b < 0;
        }

        _ground = new double[graph.IslandCount];
        for (var island = 0; island < _ground.Length; island++)
        {
            var bus = graph.ReferenceBus[island];
            rowSize[bus] = rowSize[bus] > 0 ? rowSize[bus] : 1;
            _ground[island] = Math.CopySign(rowSize[bus], diagonal[bus]);
            diagonal[bus] += _ground[island];
        }

        _factor.Factor(diagonal, _edge, rowSize);
        _refine |= _factor.ShiftedPivots > 0;
    }

    /// <summary>Angles (rad) for injections (MW) that sum to zero over every island; both by bus, not the same memory.</summary>
    public void Solve(ReadOnlySpan<double> injectionMw, Span<double> angleRad)
    {
        injectionMw.CopyTo(angleRad);
        _factor.Solve(angleRad, _work);
        if (!_refine)
            return;
        var last = double.PositiveInfinity;
        for (var step = 0; step < MaxRefinements; step++)
        {
            var error = Residual(injectionMw, angleRad);
            if (error == 0 || !(error < 0.5 * last))
                return;
            last = error;
            _factor.Solve(_residual, _work);
            for (var i = 0; i < angleRad.Length; i++)
                angleRad[i] += _residual[i];
        }
    }

    private double Residual(ReadOnlySpan<double> injectionMw, ReadOnlySpan<double> angleRad)
    {
        injectionMw.CopyTo(_residual);
        for (var island = 0; island < _ground.Length; island++)
            _residual[_graph.ReferenceBus[island]] -= _ground[island] * angleRad[_graph.ReferenceBus[island]];
        for (var e = 0; e < _edge.Length; e++)
        {
            int a = _graph.EdgeA[e], b = _graph.EdgeB[e];
            var flow = _edge[e] * (angleRad[a] - angleRad[b]);
            _residual[a] += flow;
            _residual[b] -= flow;
        }

        double largest = 0;
        foreach (var value in _residual)
            largest = Math.Max(largest, Math.Abs(value));
        return largest;
    }
}
