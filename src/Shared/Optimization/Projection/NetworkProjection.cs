using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>
/// Closest network-feasible injections: min Σ ρ_b/2 (z_b − wish_b)² over the free buses, subject to Σ z = 0 in every island,
/// |flow(z)| ≤ limit on every line, and z_b = wish_b at buses that are not free.
/// </summary>
/// <remarks>
/// Without a binding line the answer is z = wish − (1/ρ) Σ wish / Σ(1/ρ). Otherwise a dual active-set method (Goldfarb and
/// Idnani 1983, from memory) takes violated lines in one by one; each call starts from the lines that the last one held, which changes the
/// effort and not the answer. If no injections meet the constraints, every bus may also leave out or throw away power at ten times the
/// price scale. Not thread-safe; no allocation once the lines that bind have been met.
/// </remarks>
public sealed class NetworkProjection
{
    // Relative to the flows at hand; their rounding errors are some hundred times smaller.
    private const double ViolationTolerance = 1e-11;

    // A row whose part outside the held rows is smaller than this, squared and relative, depends on them.
    private const double Dependent = 1e-11;
    private const double UnservedTolerance = 1e-7;

    private readonly GridGraph _graph;
    private readonly SusceptanceSystem _system;
    private readonly double[] _penalty;
    private readonly double _unservedPrice;
    private readonly int[] _freeBus;
    private readonly double[] _rootWeight;
    private readonly double[] _islandWeight;
    private readonly double[] _islandSum;
    private readonly LineRows _rows;
    private readonly ActiveLines _active = new();
    private readonly double[] _balanced;
    private readonly double[] _angle;
    private readonly double[] _flow;
    private readonly double[] _openFlow;
    private readonly double[] _linePrice;
    private readonly double[] _move;
    private double[] _products = new double[16];
    private double[] _response = new double[16];
    private double[] _keptFlow = new double[16];
    private NetworkProgram? _program;
    private int _steps;

    /// <summary>Prepares a network; the sparse factorisation happens here.</summary>
    /// <param name="network">Its lines matter; its generators do not.</param>
    /// <param name="penaltyPerMw2h">ρ by bus, $/MW²h; above 0 where free, ignored elsewhere.</param>
    /// <param name="free">By bus, whether its injection may move.</param>
    /// <param name="priceScalePerMwh">Public price scale L, $/MWh, above 0; unserved power costs ten times as much.</param>
    /// <exception cref="ArgumentException">A length, penalty or price scale is out of range.</exception>
    public NetworkProjection(
        Network network, ReadOnlySpan<double> penaltyPerMw2h, ReadOnlySpan<bool> free, double priceScalePerMwh)
    {
        var buses = network.Buses.Count;
        if (penaltyPerMw2h.Length != buses || free.Length != buses)
            throw new ArgumentException($"Penalties and free marks must be given for all {buses} buses.", nameof(penaltyPerMw2h));
        if (!(priceScalePerMwh > 0) || !double.IsFinite(priceScalePerMwh))
            throw new ArgumentOutOfRangeException(nameof(priceScalePerMwh), priceScalePerMwh, "Must be positive and finite.");
        _graph = new GridGraph(network);
        _system = new SusceptanceSystem(_graph);
        _penalty = penaltyPerMw2h.ToArray();
        _unservedPrice = 10 * priceScalePerMwh;
        _islandWeight = new double[_graph.IslandCount];
        _islandSum = new double[_graph.IslandCount];
        var freeBus = new List<int>(buses);
        var rootWeight = new List<double>(buses);
        for (var i = 0; i < buses; i++)
        {
            if (!free[i])
                continue;
            if (!(_penalty[i] > 0) || !double.IsFinite(_penalty[i]))
                throw new ArgumentException($"The penalty at {network.Buses[i].Name} must be positive and finite.", nameof(penaltyPerMw2h));
            freeBus.Add(i);
            rootWeight.Add(Math.Sqrt(1 / _penalty[i]));
            _islandWeight[_graph.IslandOf[i]] += 1 / _penalty[i];
        }

        _freeBus = [.. freeBus];
        _rootWeight = [.. rootWeight];
        _rows = new LineRows(_graph, _system, _freeBus, _rootWeight, _islandWeight);
        _balanced = new double[buses];
        _angle = new double[buses];
        _flow = new double[_graph.LineCount];
        _openFlow = new double[_graph.LineCount];
        _linePrice = new double[_graph.LineCount];
        _move = new double[_freeBus.Length];
    }

    /// <summary>By line, from the last call: what one more MW of its limit would save, $/MWh, at least 0.</summary>
    public ReadOnlySpan<double> LinePricePerMwh => _linePrice;

    /// <summary>By line, from the last call, MW.</summary>
    public ReadOnlySpan<double> FlowMw => _flow;

    /// <summary>Projects wished injections (MW by bus); the result may not share memory with the wish.</summary>
    /// <exception cref="ArgumentException">A length does not fit, or a wish is not finite.</exception>
    public ProjectionOutcome Project(ReadOnlySpan<double> wishMw, Span<double> projectedMw)
    {
        if (wishMw.Length != _graph.BusCount || projectedMw.Length != _graph.BusCount)
            throw new ArgumentException($"Injections must be given for all {_graph.BusCount} buses.", nameof(wishMw));
        for (var i = 0; i < wishMw.Length; i++)
        {
            if (!double.IsFinite(wishMw[i]))
                throw new ArgumentException($"The wish at bus number {i} is not finite.", nameof(wishMw));
        }

        _steps = 0;
        Array.Clear(_linePrice);
        if (!Balance(wishMw) || !HoldLines(projectedMw))
            return Relax(wishMw, projectedMw);
        for (var k = 0; k < _active.Count; k++)
            _linePrice[_active.Lines[k]] = Math.Abs(_active.Multipliers[k]);
        return new ProjectionOutcome(_active.Count, false, 0, _steps, true);
    }

    /// <summary>z = wish − (1/ρ) Σ wish / Σ(1/ρ), island by island; false if an island has nothing free to balance it.</summary>
    private bool Balance(ReadOnlySpan<double> wishMw)
    {
        Array.Clear(_islandSum);
        double size = 0;
        for (var i = 0; i < wishMw.Length; i++)
        {
            _islandSum[_graph.IslandOf[i]] += wishMw[i];
            size = Math.Max(size, Math.Abs(wishMw[i]));
        }

        for (var island = 0; island < _islandSum.Length; island++)
        {
            if (_islandWeight[island] == 0 && Math.Abs(_islandSum[island]) > 1e-9 * Math.Max(1, size))
                return false;
        }

        wishMw.CopyTo(_balanced);
        for (var k = 0; k < _freeBus.Length; k++)
        {
            var island = _graph.IslandOf[_freeBus[k]];
            _balanced[_freeBus[k]] -= _rootWeight[k] * _rootWeight[k] * _islandSum[island] / _islandWeight[island];
        }

        return true;
    }

    /// <summary>The dual active-set method; false if the lines' limits cannot all be met.</summary>
    private bool HoldLines(Span<double> projectedMw)
    {
        Flows(_balanced, _openFlow);
        double size = 1;
        foreach (var flow in _openFlow)
            size = Math.Max(size, Math.Abs(flow));
        var tolerance = ViolationTolerance * size;
        DropStale();
        var most = 20 + (10 * _graph.LineCount);
        while (true)
        {
            Place(projectedMw);
            Flows(projectedMw, _flow);
            if (!KeepViolated(tolerance))
                return true;
            if (!HoldKept(tolerance, most))
            {
                _active.Clear();
                return false;
            }
        }
    }

    /// <summary>Keeps the rows of all lines that are over their limit; false if there are none.</summary>
    private bool KeepViolated(double tolerance)
    {
        var found = false;
        for (var l = 0; l < _flow.Length; l++)
        {
            if (Math.Abs(_flow[l]) - _graph.LimitMw[l] <= tolerance || _active.Contains(l))
                continue;
            _rows.Keep(l, _active.Lines);
            found = true;
        }

        return found;
    }

    /// <summary>
    /// Solves the problem with the limits of the kept lines alone, whose flows follow from the products of their rows:
    /// open flow − Σ y aᵀa'. All flows of the network are looked at again only after that.
    /// </summary>
    private bool HoldKept(double tolerance, int most)
    {
        if (_keptFlow.Length < _rows.Count)
            _keptFlow = new double[2 * _rows.Count];
        while (true)
        {
            var count = _rows.Count;
            for (var slot = 0; slot < count; slot++)
                _keptFlow[slot] = _openFlow[_rows.LineAt(slot)];
            for (var k = 0; k < _active.Count; k++)
                Dense.Add(-_active.Multipliers[k], _rows.ProductsOf(_active.Lines[k]), _keptFlow);
            var worst = -1;
            var largest = tolerance;
            for (var slot = 0; slot < count; slot++)
            {
                var violation = Math.Abs(_keptFlow[slot]) - _graph.LimitMw[_rows.LineAt(slot)];
                if (violation > largest && !_active.Contains(_rows.LineAt(slot)))
                    (worst, largest) = (slot, violation);
            }

            if (worst < 0)
                return true;
            if (++_steps > most || !TakeIn(_rows.LineAt(worst), _keptFlow[worst]))
                return false;
        }
    }

    private void Flows(ReadOnlySpan<double> injectionMw, double[] flowMw)
    {
        _system.Solve(injectionMw, _angle);
        for (var l = 0; l < flowMw.Length; l++)
            flowMw[l] = _graph.SusceptanceMwPerRad[l] * (_angle[_graph.From[l]] - _angle[_graph.To[l]]);
    }

    /// <summary>Multipliers for the held lines, G y = open flow − limit; those with the wrong sign go, worst first.</summary>
    private void DropStale()
    {
        while (_active.Count > 0)
        {
            SolveMultipliers();
            var worst = -1;
            double least = 0;
            for (var k = 0; k < _active.Count; k++)
            {
                var value = _active.Sides[k] * _active.Multipliers[k];
                if (value < least)
                    (worst, least) = (k, value);
            }

            if (worst < 0)
                return;
            _active.RemoveAt(worst);
            _steps++;
        }
    }

    private void SolveMultipliers()
    {
        Room();
        for (var k = 0; k < _active.Count; k++)
        {
            var line = _active.Lines[k];
            _products[k] = _openFlow[line] - (_active.Sides[k] * _graph.LimitMw[line]);
        }

        _active.SolveRefined(_products, _active.Multipliers);
    }

    private void Room()
    {
        if (_products.Length > _active.Count)
            return;
        _products = new double[2 * _products.Length];
        _response = new double[_products.Length];
    }

    /// <summary>z = balanced − √w ∘ Σ y a.</summary>
    private void Place(Span<double> projectedMw)
    {
        _balanced.CopyTo(projectedMw);
        if (_active.Count == 0)
            return;
        SolveMultipliers();
        Array.Clear(_move);
        for (var k = 0; k < _active.Count; k++)
            Dense.Add(_active.Multipliers[k], _rows.RowOf(_active.Lines[k]), _move);
        for (var k = 0; k < _freeBus.Length; k++)
            projectedMw[_freeBus[k]] -= _rootWeight[k] * _move[k];
    }

    /// <summary>
    /// Raises the multiplier t of a violated line p. With r = G⁻¹(aᵢᵀa_p) the held multipliers fall by t r, their flows stay, and the flow
    /// of p falls by t (a_pᵀa_p − rᵀ(aᵢᵀa_p)). Lines whose multiplier reaches zero first are dropped on the way. False: no t will do.
    /// </summary>
    private bool TakeIn(int line, double flowMw)
    {
        var products = _rows.ProductsOf(line);
        var own = products[_rows.SlotOf(line)];
        var side = (double)Math.Sign(flowMw);
        var violation = Math.Abs(flowMw) - _graph.LimitMw[line];
        double raised = 0;
        if (own <= 1e-13 * _islandWeight[_graph.IslandOf[_graph.From[line]]])
            return false;
        while (true)
        {
            Room();
            var count = _active.Count;
            for (var k = 0; k < count; k++)
                _products[k] = products[_rows.SlotOf(_active.Lines[k])];
            _active.Solve(_products, _response);
            var unexplained = own - Dense.Dot(_response.AsSpan(0, count), _products);
            var full = unexplained > Dependent * own ? violation / unexplained : double.PositiveInfinity;
            var (blocking, step) = FirstToVanish(side);
            if (double.IsInfinity(full) && blocking < 0)
                return false;
            var length = Math.Min(full, step);
            for (var k = 0; k < count; k++)
                _active.Multipliers[k] -= length * side * _response[k];
            raised += length;
            if (full <= step)
            {
                _active.Append(line, side, side * raised, _products, own, unexplained);
                return true;
            }

            violation -= length * Math.Max(0, unexplained);
            _active.RemoveAt(blocking);
            _steps++;
        }
    }

    private (int Blocking, double Step) FirstToVanish(double side)
    {
        var blocking = -1;
        var step = double.PositiveInfinity;
        for (var k = 0; k < _active.Count; k++)
        {
            var fall = _active.Sides[k] * side * _response[k];
            if (fall <= 0)
                continue;
            var reach = Math.Max(0, _active.Sides[k] * _active.Multipliers[k] / fall);
            if (reach < step)
                (blocking, step) = (k, reach);
        }

        return (blocking, step);
    }

    /// <summary>The same problem with power left out or thrown away at a price, by the interior-point method.</summary>
    private ProjectionOutcome Relax(ReadOnlySpan<double> wishMw, Span<double> projectedMw)
    {
        _active.Clear();
        _program ??= new NetworkProgram(_graph);
        var blocks = new Block[_freeBus.Length];
        for (var k = 0; k < blocks.Length; k++)
        {
            blocks[k] = new Block(
                _freeBus[k], double.NegativeInfinity, double.PositiveInfinity, 0, _penalty[_freeBus[k]]);
        }

        var demand = new double[wishMw.Length];
        double total = 1;
        for (var i = 0; i < demand.Length; i++)
        {
            demand[i] = -wishMw[i];
            total += Math.Abs(wishMw[i]);
        }

        var solution = _program.SolveElastic(blocks, demand, _unservedPrice);
        double unserved = 0;
        for (var i = 0; i < projectedMw.Length; i++)
        {
            projectedMw[i] = wishMw[i] + solution.ShedMw[i] - solution.SpillMw[i];
            unserved += solution.ShedMw[i] + solution.SpillMw[i];
        }

        for (var k = 0; k < blocks.Length; k++)
            projectedMw[_freeBus[k]] += solution.BlockMw[k];
        solution.FlowMw.CopyTo(_flow, 0);
        solution.LinePricePerMwh.CopyTo(_linePrice, 0);
        var held = _linePrice.Count(price => price > 0);
        var relaxed = unserved > UnservedTolerance * total;
        return new ProjectionOutcome(held, relaxed, relaxed ? unserved : 0, _steps, solution.Converged);
    }
}
