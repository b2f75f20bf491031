using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>
/// A coordinator core driven by hand, with sites that answer whatever the test says. Every step is checked on the way: time and
/// journal order, and that what leaves was journalled in the same step.
/// </summary>
internal sealed class CoordinatorBench
{
    public const int LatticeExponent = -30;

    /// <summary>Answers of 1 MW at every component never settle: they never sum to zero.</summary>
    public const double UnsettledMw = 1;

    public CoordinatorBench(Plan plan)
        : this(new SetupBuilder(plan).Coordinator)
    {
    }

    public CoordinatorBench(CoordinatorSetup setup)
    {
        Setup = setup;
        Core = new CoordinatorCore(setup);
    }

    public CoordinatorSetup Setup { get; }

    public CoordinatorCore Core { get; }

    public TimeSpan Now { get; set; }

    /// <summary>All journal entries so far.</summary>
    public List<JournalEntry> Journal { get; } = [];

    /// <summary>Everything sent so far.</summary>
    public List<(int Site, CoordinatorMessage Message)> Sent { get; } = [];

    /// <summary>The last ask of each site.</summary>
    public Dictionary<int, Ask> Asks { get; } = [];

    /// <summary>Journal entries of the last step.</summary>
    public JournalEntry[] Stored { get; private set; } = [];

    /// <summary>Messages of the last step.</summary>
    public (int Site, CoordinatorMessage Message)[] SentNow { get; private set; } = [];

    public bool Finished { get; private set; }

    public IEnumerable<int> AskedNow => SentNow.Where(send => send.Message is CoordinatorMessage.Asked).Select(send => send.Site);

    /// <summary>A bench whose sites have all joined and been asked for the first round.</summary>
    public static CoordinatorBench Asking(Plan plan)
    {
        var bench = new CoordinatorBench(plan);
        bench.Step(new CoordinatorInput.Started());
        bench.JoinAll();
        return bench;
    }

    public Enrol Enrol(RoundId answeredThrough = default, double noiseScale = 0) =>
        new(Setup.SetupDigest, LatticeExponent, noiseScale, 0, answeredThrough);

    public void Step(CoordinatorInput input)
    {
        var step = Core.Step(input, Now);
        Stored = [.. step.Store];
        SentNow = [.. step.Send];
        Journal.AddRange(Stored);
        Sent.AddRange(SentNow);
        Finished = step.Finished;
        foreach (var (site, message) in SentNow)
        {
            if (message is not CoordinatorMessage.Asked asked)
                continue;
            var entry = Assert.Single(Stored.OfType<JournalEntry.RoundAsked>(), e => e.Id == asked.Ask.Id);
            Assert.Contains((site, asked.Ask), entry.Asks);
            Asks[site] = asked.Ask;
        }
    }

    public void Join(int site, RoundId answeredThrough = default) => Step(new CoordinatorInput.SiteJoined(site, Enrol(answeredThrough)));

    public void JoinAll()
    {
        for (var s = 0; s < Setup.Sites.Count; s++)
            Join(s);
    }

    public void WakeAfter(double seconds)
    {
        Now += TimeSpan.FromSeconds(seconds);
        Step(new CoordinatorInput.Woke());
    }

    /// <summary>The right answer in form to the site's last ask, the same number of MW everywhere.</summary>
    public Answer AnswerTo(int site, double mw)
    {
        var ask = Asks[site];
        var length = ask.Everything ? Setup.Sites[site].Components.Count : ask.Consensus.Length;
        return new Answer(ask.Id, ask.Everything, Enumerable.Repeat((long)Math.ScaleB(mw, -LatticeExponent), length).ToArray());
    }

    public void Answer(int site, double mw = UnsettledMw) => Step(new CoordinatorInput.AnswerArrived(site, AnswerTo(site, mw)));

    /// <summary>Lets these sites answer the round that is open.</summary>
    public void AnswerAll(IEnumerable<int> sites, double mw = UnsettledMw)
    {
        foreach (var site in sites.ToArray())
            Answer(site, mw);
    }

    public void Refuse(int site, RefusalReason reason = RefusalReason.BudgetSpent) =>
        Step(new CoordinatorInput.RefusalArrived(site, new Refusal(Asks[site].Id, reason, "No.")));

    /// <summary>The last closed round.</summary>
    public JournalEntry.RoundClosed LastClosed => Journal.OfType<JournalEntry.RoundClosed>().Last();

    /// <summary>The last round that was asked.</summary>
    public JournalEntry.RoundAsked LastAsked => Journal.OfType<JournalEntry.RoundAsked>().Last();
}
