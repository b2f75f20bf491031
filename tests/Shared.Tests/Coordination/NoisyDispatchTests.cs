using Halfvoice.Coordination;
using Halfvoice.Optimization;
using Halfvoice.Plans;
using Halfvoice.Privacy;
using Halfvoice.Tests.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>Whole cycles with noise on every answer.</summary>
public class NoisyDispatchTests
{
    [Fact]
    public void What_a_noisy_cycle_ends_with_is_balanced_and_within_every_line_limit()
    {
        var plan = PlanFolders.Read(PlanFolders.Demo).Plan! with { Cycles = 6 };
        var setups = new SetupBuilder(plan);
        var (journal, _) = Run(plan, 11);
        var flow = new PowerFlow(plan.Network);
        var names = plan.Network.Buses.Select((bus, b) => (bus.Name, b)).ToDictionary(pair => pair.Name, pair => pair.b);
        var parts = setups.Coordinator.Sites.SelectMany(site => site.Components).Select(part => names[part.Bus]).ToArray();
        var ends = journal.OfType<JournalEntry.CycleClosed>().ToArray();
        Assert.Equal(6, ends.Length);
        foreach (var end in ends)
        {
            Assert.Equal(0, end.UnservedMw);
            var injection = new double[plan.Network.Buses.Count];
            for (var k = 0; k < parts.Length; k++)
                injection[parts[k]] = end.State.Consensus[k];
            Assert.Equal(0, injection.Sum(), 1e-6);
            var flows = flow.FlowMw(injection);
            for (var l = 0; l < flows.Length; l++)
                Assert.InRange(Math.Abs(flows[l]), 0, plan.Network.Lines[l].LimitMw + 1e-6);
        }
    }

    [Fact]
    public void A_cycle_ends_with_the_mean_of_the_consensus_over_the_last_half_of_its_rounds()
    {
        var plan = PlanFolders.Read(PlanFolders.Demo).Plan! with { Cycles = 1 };
        plan = plan with { Stop = plan.Stop with { RoundCap = 20, MismatchFraction = 1e-12, PriceMovePerMwh = 1e-12 } };
        var (journal, _) = Run(plan, 12);
        var end = journal.OfType<JournalEntry.CycleClosed>().Single();
        var asked = journal.OfType<JournalEntry.RoundAsked>().Select(entry => entry.State.Consensus).ToArray();
        var window = (end.Rounds + 1) / 2;
        Assert.Equal(window, end.Measure.Window);

        // The consensus after round r is what round r + 1 was asked with; that of the last round is the rest of the mean.
        var last = asked[^1].Select((_, k) => (end.State.Consensus[k] * window) - asked.TakeLast(window - 1).Sum(z => z[k])).ToArray();
        Assert.True(window > 2);
        var mismatch = 0.0;
        var answers = journal.OfType<JournalEntry.RoundClosed>().ToArray();
        var setups = new SetupBuilder(plan);
        var map = new ComponentMap(setups.Coordinator);
        var exponents = Sites(plan, 12).Select(site => site.Enrolment().LatticeExponent).ToArray();
        for (var k = 0; k < map.Count; k++)
        {
            if (!map.Adjustable[k])
                continue;
            var sum = 0.0;
            for (var r = end.Rounds - window; r < end.Rounds; r++)
            {
                var z = r + 1 < asked.Length ? asked[r + 1][k] : last[k];
                sum += Released(answers[r], map, k, exponents[map.SiteOf[k]]) - z;
            }

            mismatch += Math.Abs(sum / window);
        }

        Assert.Equal(mismatch, end.Measure.MismatchMw, 1e-6);
    }

    [Fact]
    public void The_same_seed_gives_the_same_journal_and_another_seed_another()
    {
        var plan = PlanFolders.Read(PlanFolders.Demo).Plan! with { Cycles = 2 };
        Assert.Equal(Text(Run(plan, 1).Journal), Text(Run(plan, 1).Journal));
        Assert.NotEqual(Text(Run(plan, 1).Journal), Text(Run(plan, 2).Journal));

        static string[] Text(List<JournalEntry> journal) => [.. journal.OfType<JournalEntry.RoundClosed>()
            .SelectMany(entry => entry.Answers.Select(answer => $"{entry.Id} {answer.Site} {string.Join(' ', answer.Answer.Steps)} {entry.Measure}"))];
    }

    [Theory]
    [InlineData(SchemeKind.Injection)]
    [InlineData(SchemeKind.Angle)]
    public void Set_points_under_noise_stay_within_the_plants_limits(SchemeKind kind)
    {
        var plan = InventedPlans.Make(8, 21, 2, 3) with { Scheme = new SchemeSettings { Kind = kind } };
        var (_, dispatch) = Run(plan, 5);
        for (var cycle = 1; cycle <= plan.Cycles; cycle++)
        {
            foreach (var (plant, mw) in plan.Network.Generators.Zip(dispatch.SetPointsMw(cycle)))
                Assert.InRange(mw, plant.MinMw - 1e-6, plant.MaxMw + 1e-6);
        }
    }

    /// <summary>The value that a site released for a component in a round, MW.</summary>
    private static double Released(JournalEntry.RoundClosed round, ComponentMap map, int k, int exponent)
    {
        var site = map.SiteOf[k];
        var answer = round.Answers.Single(a => a.Site == site).Answer;
        var index = answer.Everything ? k - map.Start(site) : Array.IndexOf(map.AdjustableOf[site], k);
        return Math.ScaleB((double)answer.Steps[index], exponent);
    }

    private static SiteCore[] Sites(Plan plan, ulong seed)
    {
        var setups = new SetupBuilder(plan);
        return plan.Network.Sites.Select(site => new SiteCore(
            setups.ForSite(site), new NoReadings(), new SeededNoiseSource(seed), [], out _)).ToArray();
    }

    private static (List<JournalEntry> Journal, LocalDispatch Dispatch) Run(Plan plan, ulong seed)
    {
        var journal = new List<JournalEntry>();
        ulong stream = 0;
        var dispatch = new LocalDispatch(plan, new SetupBuilder(plan), _ => new SeededNoiseSource(seed, stream++));
        dispatch.Journalled += journal.Add;
        dispatch.Run();
        return (journal, dispatch);
    }

    private sealed class NoReadings : ILoadReadings
    {
        public bool TryRead(int cycle, Span<double> loadMw) => false;
    }
}
