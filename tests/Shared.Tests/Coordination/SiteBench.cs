using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Privacy;

namespace Halfvoice.Tests.Coordination;

/// <summary>What one step of a site left, copied.</summary>
internal sealed record SiteDone(ChargeRow[] Charges, SetPoint[] SetPoints, SiteReply? Reply)
{
    public Answer Answer => Assert.IsType<SiteReply.Answered>(Reply).Answer;

    public Refusal Refusal => Assert.IsType<SiteReply.Refused>(Reply).Refusal;
}

/// <summary>A site core driven by hand, with a ledger that outlives it.</summary>
internal sealed class SiteBench : ILoadReadings
{
    private SiteSetup _setup;
    private readonly double[] _loadMw;
    private readonly ulong _seed;
    private ulong _starts;
    private SiteCore _core;

    public SiteBench(Plan plan, string site, ulong seed = 1)
    {
        // Tests ask about later cycles than the small plans have; only a campaign's allowance depends on how many there are.
        var setup = new SetupBuilder(plan).ForSite(site);
        _setup = plan.Privacy.Scope == PrivacyScope.Campaign ? setup : setup with { CampaignCycles = 1000 };
        _loadMw = plan.Loads[site].At(1);
        _seed = seed;
        _core = Start();
    }

    public SiteSetup Setup => _setup;

    public SiteCore Core => _core;

    public SortedDictionary<long, ChargeRow> Ledger { get; } = [];

    public bool HasReading { get; set; } = true;

    /// <summary>The site's clock; stands still unless a test moves it.</summary>
    public TimeSpan Now { get; set; } = TimeSpan.FromSeconds(1);

    /// <summary>Spent and reserved, in answers.</summary>
    public int AnswersCharged => Ledger.Values.Sum(row => row.ChargedAnswers);

    /// <summary>SmallPlan with noise: ε shared by the rounds of the scope.</summary>
    public static Plan Noisy(int roundCap = 50, double epsilon = 1, PrivacyScope scope = PrivacyScope.Cycle, int cycles = 1) =>
        SmallPlan.Of(2, 2, cycles, roundCap) with
        {
            Privacy = new PrivacySettings { Epsilon = epsilon, Scope = scope, AdjacencyMw = 1, Stated = true },
        };

    public bool TryRead(int cycle, Span<double> loadMw)
    {
        _loadMw.CopyTo(loadMw);
        return HasReading;
    }

    /// <summary>A new bundle for the same ledger: a longer campaign.</summary>
    public void Repack(int campaignCycles)
    {
        _setup = _setup with { CampaignCycles = campaignCycles };
        Restart();
    }

    public SiteDone Step(SiteInput input)
    {
        var step = _core.Step(input, Now);
        foreach (var row in step.Charges)
            Ledger[row.Id] = row;
        var done = new SiteDone([.. step.Charges], [.. step.SetPoints], step.Reply);
        _core.PrepareNoise();
        return done;
    }

    public SiteDone Ask(int cycle, int round, double consensus = 0, double dual = 0) => Step(new SiteInput.Asked(Asking(cycle, round, consensus, dual)));

    public Ask Asking(int cycle, int round, double consensus = 0, double dual = 0)
    {
        var moving = SiteSchemes.Create(_setup).Adjustable.Count;
        return new Ask(new RoundId(cycle, round), round == 1 || moving == 0,
            Enumerable.Repeat(consensus, moving).ToArray(), Enumerable.Repeat(dual, moving).ToArray());
    }

    public SiteDone End(int cycle, int rounds, CycleEnd end = CycleEnd.Settled, double consensus = 5)
    {
        var count = SiteSchemes.Create(_setup).ComponentCount;
        return Step(new SiteInput.Ended(new Outcome(cycle, end, rounds, Enumerable.Repeat(consensus, count).ToArray(), new double[count])));
    }

    /// <summary>Kills the core and starts another one from the ledger.</summary>
    public void Restart() => _core = Start();

    private SiteCore Start()
    {
        var core = new SiteCore(_setup, this, new SeededNoiseSource(_seed, ++_starts), Ledger.Values, out var forfeited);
        foreach (var row in forfeited)
            Ledger[row.Id] = row;
        return core;
    }
}
