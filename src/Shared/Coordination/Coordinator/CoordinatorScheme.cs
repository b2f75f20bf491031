namespace Halfvoice.Coordination;

/// <summary>
/// The coordinator's half of a consensus scheme: values released by sites go in, asks and the state of the consensus come
/// out. Over-relaxed alternating direction method of multipliers (Boyd et al. 2011, §3.4.3 and §7.1); what "consensus"
/// means is the derived class's one decision.
/// </summary>
/// <remarks>A missing answer leaves the last one standing; how long that may go on is decided by CoordinatorCore.</remarks>
public abstract class CoordinatorScheme
{
    private readonly double _relaxation;
    private readonly int _roundCap;
    private readonly bool[] _known;
    private readonly double[] _mixed;
    private readonly double[] _before;

    protected CoordinatorScheme(CoordinatorSetup setup)
    {
        Map = new ComponentMap(setup);
        _relaxation = setup.Relaxation;
        _roundCap = setup.RoundCap;
        Value = new double[Map.Count];
        Consensus = new double[Map.Count];
        Dual = new double[Map.Count];
        NoiseScale = new double[Map.Count];
        _known = new bool[Map.Count];
        _mixed = new double[Map.Count];
        _before = new double[Map.Count];
        Trail = new ConvergenceTrail(Map);
    }

    public ComponentMap Map { get; }

    /// <summary>Last released value of every component, MW or rad.</summary>
    protected double[] Value { get; }

    /// <summary>z, MW, or the consensus angle, rad, by component.</summary>
    public double[] Consensus { get; }

    /// <summary>u, $/MWh, or λ, $/(rad·h), by component.</summary>
    public double[] Dual { get; }

    /// <summary>Scale of the noise on each component as the sites declare it, MW or rad.</summary>
    public double[] NoiseScale { get; }

    /// <summary>Unserved or surplus power in the last consensus, MW; above 0 where the released values cannot all be honoured.</summary>
    public double UnservedMw { get; protected set; }

    private ConvergenceTrail Trail { get; }

    /// <summary>Makes the coordinator's half of the scheme that the setup names.</summary>
    public static CoordinatorScheme Create(CoordinatorSetup setup) => setup.Scheme switch
    {
        Plans.SchemeKind.Injection => new InjectionCoordinator(setup),
        Plans.SchemeKind.Angle => new AngleCoordinator(setup),
        _ => throw new ArgumentOutOfRangeException(nameof(setup), setup.Scheme, "There is no such scheme."),
    };

    /// <summary>Starts a cycle: consensus and duals go on from the last one, data that cannot move must be heard afresh.</summary>
    public void BeginCycle()
    {
        Array.Clear(_known);
        Trail.Begin(NoiseScale, _roundCap);
    }

    /// <summary>Whether the site has anything to answer in this round.</summary>
    public bool NeedsAnswer(int site) => Map.AdjustableOf[site].Length > 0 || WantsEverything(site);

    /// <summary>Whether some component of the site has not been heard in this cycle.</summary>
    public bool WantsEverything(int site) =>
        Array.IndexOf(_known, false, Map.Start(site), Map.CountOf(site)) >= 0;

    /// <summary>True once every component has been heard in this cycle.</summary>
    public bool AllKnown => Array.IndexOf(_known, false) < 0;

    public Ask BuildAsk(int site, RoundId id)
    {
        var own = Map.AdjustableOf[site];
        return new Ask(id, WantsEverything(site), Array.ConvertAll(own, k => Consensus[k]), Array.ConvertAll(own, k => Dual[k]));
    }

    /// <summary>Numbers that an answer to such an ask must have.</summary>
    public int AnswerLength(int site, bool everything) => everything ? Map.CountOf(site) : Map.AdjustableOf[site].Length;

    /// <summary>Takes a site's released values, already checked for length and bounds.</summary>
    public void Take(int site, bool everything, ReadOnlySpan<double> values)
    {
        if (values.Length != AnswerLength(site, everything))
            throw new ArgumentException("The answer's length was not checked.", nameof(values));
        var start = Map.Start(site);
        var own = Map.AdjustableOf[site];
        for (var i = 0; i < values.Length; i++)
        {
            var k = everything ? start + i : own[i];
            Value[k] = values[i];
            _known[k] = true;
        }
    }

    /// <summary>Closes a round: relaxation, consensus, dual update, and how far all of it still moved.</summary>
    public RoundMeasure Close()
    {
        Array.Copy(Consensus, _before, _before.Length);
        for (var k = 0; k < _mixed.Length; k++)
        {
            _mixed[k] = Map.Adjustable[k]
                ? (_relaxation * Value[k]) + ((1 - _relaxation) * Consensus[k]) + (Dual[k] / Map.Penalty[k])
                : Value[k];
        }

        FindConsensus(_mixed, Consensus);
        for (var k = 0; k < _mixed.Length; k++)
        {
            // u ← u + ρ (x̂ − z); x̂ + u/ρ stands in _mixed already.
            if (Map.Adjustable[k])
                Dual[k] = Map.Penalty[k] * (_mixed[k] - Consensus[k]);
        }

        return Trail.Add(Value, Consensus, _before, Dual);
    }

    /// <summary>
    /// Consensus and dual that a site is told at the end of a cycle: with noise the mean over the last rounds, which is
    /// post-processing of released values and as network-feasible as each of its terms.
    /// </summary>
    public (double[] Consensus, double[] Dual) Final(int site)
    {
        var (consensus, dual) = Trail.Mean(Consensus, Dual);
        var start = Map.Start(site);
        var count = Map.CountOf(site);
        return (consensus.AsSpan(start, count).ToArray(), dual.AsSpan(start, count).ToArray());
    }

    /// <summary>Ends a cycle: the next one starts from the means where there was noise.</summary>
    public void EndCycle()
    {
        var (consensus, dual) = Trail.Mean(Consensus, Dual);
        consensus.CopyTo(Consensus, 0);
        dual.CopyTo(Dual, 0);
    }

    /// <summary>Finds the consensus nearest to what sites want, in the metric of the penalties.</summary>
    /// <param name="wish">x̂ + u/ρ by component; released data where a component cannot move.</param>
    protected abstract void FindConsensus(ReadOnlySpan<double> wish, Span<double> consensus);
}
