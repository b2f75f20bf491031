namespace Halfvoice.Coordination;

/// <summary>What the coordinator knows of a site's presence.</summary>
internal sealed class SiteSeat
{
    // A plan may ask for noise above the bound (a tiny epsilon); a thousand times it is no plan.
    private const double MostTimesBound = 1000;

    private readonly CoordinatorSite _site;
    private double _step;
    private long _boundSteps;

    public SiteSeat(CoordinatorSite site) => _site = site;

    public bool Joined { get; private set; }

    /// <summary>The last round that the site says it may have answered.</summary>
    public RoundId AnsweredThrough { get; private set; }

    /// <summary>Whether the current round needs this site.</summary>
    public bool InRound { get; set; }

    /// <summary>Whether an answer is still outstanding in the current round.</summary>
    public bool Awaited { get; set; }

    /// <summary>Whether the site answered in the current round.</summary>
    public bool Fresh { get; set; }

    /// <summary>Rounds in a row for which an old answer has stood in.</summary>
    public int Age { get; set; }

    /// <summary>
    /// Whether what a site declares can be true: noise and lattice steps of many times the public bound would say nothing, and they
    /// would lift the noise floor or the bound on answers until anything passes.
    /// </summary>
    public bool IsPlausible(Enrol enrol)
    {
        // A site without components has nothing to declare about.
        var most = MostTimesBound * Bound;
        return _site.Components.Count == 0 || (enrol.NoiseScale <= most && Math.ScaleB(1, enrol.LatticeExponent) <= most);
    }

    public void Join(Enrol enrol)
    {
        Joined = true;
        AnsweredThrough = enrol.AnsweredThrough;
        _step = Math.ScaleB(1, enrol.LatticeExponent);
        var bound = Bound;

        // Noise goes past the bound on values; a public margin of a hundred scales is passed once in 10^43 answers.
        var steps = Math.Ceiling((bound + (100 * enrol.NoiseScale)) / _step);
        _boundSteps = steps < long.MaxValue ? (long)steps : long.MaxValue;
    }

    private double Bound => _site.Components.Count == 0 ? 0 : _site.Components.Max(part => part.Bound);

    /// <summary>What the site answered before it left stays an answer of its round.</summary>
    public void Leave() => Joined = false;

    /// <summary>Turns steps into values; false where a number lies outside the public bounds.</summary>
    public bool TryRead(Answer answer, out double[] values)
    {
        values = new double[answer.Steps.Length];
        for (var i = 0; i < values.Length; i++)
        {
            if (Int128.Abs(answer.Steps[i]) > _boundSteps)
                return false;
            values[i] = answer.Steps[i] * _step;
        }

        return true;
    }
}
