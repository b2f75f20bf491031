using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>
/// The site problem of scheme <c>angle</c> for a site of one or more buses.
/// <code>
/// min  Σ c_g(p_g) + Σ_c w_c/2 · (θ_c − a_c)² + V · Σ_b (shed_b + spill_b)
/// s.t. Σ_g∈b p_g − load_b + shed_b − spill_b = Σ_l∈b flow_l at every own bus,  flow_l = b_l (θ_from − θ_to),
///      |flow_l| ≤ limit_l on inner and tie lines,  min_g ≤ p_g ≤ max_g,  shed, spill ≥ 0
/// </code>
/// The program without shedding comes first: if it has an answer with every nodal price within [−V, V], that answer is
/// optimal for the whole, since no bus would gain by shedding or spilling. Otherwise the program with both is solved.
/// Not safe for concurrent use; steady use allocates nothing.
/// </summary>
public sealed class AreaAngleProblem
{
    private readonly AreaModel _model;
    private readonly AreaReduction _reduction;
    private readonly double _priceScale;
    private readonly int[] _unitOf;
    private readonly List<AreaUnit> _units = [];
    private readonly AreaProgram _served;
    private readonly double[] _fixedMw;
    private readonly double[] _netLoadMw;
    private readonly double[] _unservedMw;
    private readonly double[] _pricePerMwh;
    private AreaProgram? _unserved;

    /// <summary>Eliminates the inner angles and factors what is left.</summary>
    /// <param name="model">Constant from round to round.</param>
    /// <exception cref="ArgumentException">The model breaks its own rules.</exception>
    public AreaAngleProblem(AreaModel model)
    {
        ArgumentNullException.ThrowIfNull(model);
        model.Validate();
        _model = model;
        _fixedMw = new double[model.OwnBusCount];
        _netLoadMw = new double[model.OwnBusCount];
        _unservedMw = new double[model.OwnBusCount];
        _pricePerMwh = new double[model.OwnBusCount];
        _unitOf = new int[model.Generators.Count];
        _priceScale = 1;
        for (var g = 0; g < _unitOf.Length; g++)
        {
            var generator = model.Generators[g];
            _unitOf[g] = generator.RangeMw > 0 ? _units.Count : -1;
            if (generator.RangeMw > 0)
                _units.Add(UnitOf(generator));
            else
                _fixedMw[generator.Bus] += generator.MinMw;
            _priceScale = Math.Max(_priceScale, Math.Abs(generator.MarginalCost(generator.MinMw)));
            _priceScale = Math.Max(_priceScale, Math.Abs(generator.MarginalCost(generator.MaxMw)));
        }

        _reduction = new AreaReduction(model);
        _served = new AreaProgram(model, _reduction, _units, _priceScale);
    }

    /// <summary>Number of copies, the length of anchors and copies.</summary>
    public int CopyCount => _model.CopyNodes.Count;

    /// <summary>Prices of the own buses after the last solve, $/MWh, within [−V, V].</summary>
    public ReadOnlySpan<double> PricePerMwh => _pricePerMwh;

    /// <summary>Load shed (positive) or power spilt (negative) at each own bus in the last solve, MW.</summary>
    public ReadOnlySpan<double> UnservedMw => _unservedMw;

    /// <summary>Forgets the last solve's head start. Answers do not change beyond rounding; the next solve takes longer.</summary>
    public void Forget()
    {
        _served.Forget();
        _unserved?.Forget();
    }

    /// <summary>Solves for one set of loads and anchors.</summary>
    /// <param name="loadMw">Loads of the own buses, MW; may be negative.</param>
    /// <param name="anchorRad">a_c, rad, in the order of the model's copies.</param>
    /// <param name="copiesRad">Receives θ_c in the same order.</param>
    /// <param name="outputMw">Receives the output of every generator, MW, in the model's order.</param>
    /// <exception cref="ArgumentException">A span has the wrong length, or a number is not finite.</exception>
    /// <exception cref="InvalidOperationException">Rounding kept the solver from an answer: the model's numbers are too
    /// far apart in size.</exception>
    public AreaAngleSolution Solve(
        ReadOnlySpan<double> loadMw, ReadOnlySpan<double> anchorRad, Span<double> copiesRad, Span<double> outputMw)
    {
        Check(loadMw, anchorRad, copiesRad, outputMw);
        for (var b = 0; b < _netLoadMw.Length; b++)
            _netLoadMw[b] = loadMw[b] - _fixedMw[b];
        var program = _served;
        var status = program.Solve(_netLoadMw, anchorRad);
        var steps = program.OuterSteps;
        if (status == DualActiveSetStatus.Infeasible || (status == DualActiveSetStatus.Optimal && PricesBeyondUnserved(program)))
        {
            program = _unserved ??= new AreaProgram(_model, _reduction, UnitsWithUnserved(), _priceScale);
            status = program.Solve(_netLoadMw, anchorRad);
            steps += program.OuterSteps;
        }

        if (status != DualActiveSetStatus.Optimal)
            throw new InvalidOperationException("A site problem found no answer; check the sizes of susceptances, weights and costs.");
        return Report(program, steps, copiesRad, outputMw);
    }

    private AreaAngleSolution Report(AreaProgram program, int steps, Span<double> copiesRad, Span<double> outputMw)
    {
        program.X[..CopyCount].CopyTo(copiesRad);
        var outputs = program.X[_reduction.AngleCount..];
        for (var g = 0; g < outputMw.Length; g++)
        {
            var generator = _model.Generators[g];
            outputMw[g] = _unitOf[g] < 0 ? generator.MinMw : Math.Clamp(outputs[_unitOf[g]], generator.MinMw, generator.MaxMw);
        }

        double shed = 0, spilt = 0;
        for (var b = 0; b < _unservedMw.Length; b++)
        {
            var limit = _model.UnservedPricePerMwh;
            _pricePerMwh[b] = Math.Clamp(program.PricePerMwh[b], -limit, limit);
            var at = _units.Count + (2 * b);
            var shedHere = program == _served ? 0 : Math.Max(outputs[at], 0);
            var spiltHere = program == _served ? 0 : Math.Max(-outputs[at + 1], 0);
            _unservedMw[b] = shedHere - spiltHere;
            shed += shedHere;
            spilt += spiltHere;
        }

        return new AreaAngleSolution(shed, spilt, program.StationarityPerMwh, steps);
    }

    private bool PricesBeyondUnserved(AreaProgram program)
    {
        var limit = _model.UnservedPricePerMwh * (1 + 1e-9);
        foreach (var price in program.PricePerMwh)
        {
            if (Math.Abs(price) > limit)
                return true;
        }

        return false;
    }

    /// <summary>Shed load acts like a generator at price V, spilt power like one at −V that takes power up.</summary>
    private AreaUnit[] UnitsWithUnserved()
    {
        var price = _model.UnservedPricePerMwh;
        var extra = Enumerable.Range(0, _model.OwnBusCount).SelectMany(bus => new[]
        {
            new AreaUnit(bus, 0, double.PositiveInfinity, 0, price),
            new AreaUnit(bus, double.NegativeInfinity, 0, 0, -price),
        });
        return [.. _units, .. extra];
    }

    private static AreaUnit UnitOf(Generator generator) =>
        new(generator.Bus, generator.MinMw, generator.MaxMw, generator.CostQuadratic, generator.CostLinear);

    private void Check(ReadOnlySpan<double> loadMw, ReadOnlySpan<double> anchorRad, Span<double> copiesRad, Span<double> outputMw)
    {
        if (loadMw.Length != _model.OwnBusCount || outputMw.Length != _model.Generators.Count)
            throw new ArgumentException("Loads must be as many as own buses, outputs as many as generators.");
        if (anchorRad.Length != CopyCount || copiesRad.Length != CopyCount)
            throw new ArgumentException($"This site has {CopyCount} copies; the anchors or copies given are not as many.");
        foreach (var load in loadMw)
        {
            if (!double.IsFinite(load))
                throw new ArgumentException("Every load must be a finite number of MW.", nameof(loadMw));
        }

        foreach (var anchor in anchorRad)
        {
            if (!double.IsFinite(anchor))
                throw new ArgumentException("Every anchor must be a finite angle.", nameof(anchorRad));
        }
    }
}
