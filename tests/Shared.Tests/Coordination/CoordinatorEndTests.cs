using Halfvoice.Coordination;
using Halfvoice.Grid;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>CoordinatorCore at the end of cycles and of a run, and after a crash.</summary>
public class CoordinatorEndTests
{
    [Fact]
    public void A_settled_cycle_tells_every_site_its_outcome_and_begins_the_next_in_the_same_step()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(3, 1, cycles: 2));
        bench.AnswerAll(Enumerable.Range(0, 4), 0);
        var end = Assert.Single(bench.Stored.OfType<JournalEntry.CycleClosed>());
        Assert.Equal((1, CycleEnd.Settled, 1), (end.Cycle, end.End, end.Rounds));
        var outcomes = bench.SentNow.Where(send => send.Message is CoordinatorMessage.Ended).ToArray();
        Assert.Equal([0, 1, 2, 3], outcomes.Select(send => send.Site));
        foreach (var (site, message) in outcomes)
        {
            var outcome = ((CoordinatorMessage.Ended)message).Outcome;
            Assert.Equal((1, CycleEnd.Settled, 1), (outcome.Cycle, outcome.End, outcome.Rounds));
            Assert.Equal(end.State.Consensus[site], Assert.Single(outcome.Consensus));
            Assert.Equal(end.State.Dual[site], Assert.Single(outcome.Dual));
        }

        Assert.Equal([0, 1, 2, 3], bench.AskedNow);
        Assert.All(bench.Asks.Values, ask => Assert.Equal(new RoundId(2, 1), ask.Id));
        Assert.All(bench.Asks.Values, ask => Assert.True(ask.Everything));
    }

    [Fact]
    public void A_cycle_that_does_not_settle_ends_at_the_round_cap_and_no_round_beyond_is_asked()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(3, 1, roundCap: 4));
        while (!bench.Finished)
            bench.AnswerAll(bench.AskedNow);
        var end = Assert.Single(bench.Journal.OfType<JournalEntry.CycleClosed>());
        Assert.Equal((CycleEnd.RoundCap, 4), (end.End, end.Rounds));
        Assert.Equal(4, bench.Journal.OfType<JournalEntry.RoundAsked>().Max(entry => entry.Id.Round));
    }

    [Fact]
    public void After_the_last_cycle_all_are_bid_farewell_and_the_run_is_finished()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(3, 1, cycles: 2));
        bench.AnswerAll(Enumerable.Range(0, 4), 0);
        Assert.False(bench.Finished);
        bench.AnswerAll(Enumerable.Range(0, 4), 0);
        Assert.True(bench.Finished);
        Assert.Null(bench.Core.WakeAt);
        Assert.Empty(bench.AskedNow);
        Assert.Equal(4, bench.SentNow.Count(send => send.Message is CoordinatorMessage.Farewell));
        for (var s = 0; s < 4; s++)
        {
            var own = bench.SentNow.Where(send => send.Site == s).Select(send => send.Message.GetType()).ToArray();
            Assert.Equal([typeof(CoordinatorMessage.Ended), typeof(CoordinatorMessage.Farewell)], own);
        }
    }

    [Fact]
    public void A_stop_ends_the_cycle_as_stopped_with_outcomes_and_farewells()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(3, 1, cycles: 5));
        bench.AnswerAll(Enumerable.Range(0, 4));
        bench.Answer(0);
        bench.Step(new CoordinatorInput.StopAsked());
        var end = Assert.IsType<JournalEntry.CycleClosed>(Assert.Single(bench.Stored));
        Assert.Equal((1, CycleEnd.Stopped), (end.Cycle, end.End));
        Assert.Equal(4, bench.SentNow.Count(send => send.Message is CoordinatorMessage.Ended { Outcome.End: CycleEnd.Stopped }));
        Assert.Equal(4, bench.SentNow.Count(send => send.Message is CoordinatorMessage.Farewell));
        Assert.True(bench.Finished);
        bench.Step(new CoordinatorInput.StopAsked());
        Assert.Empty(bench.SentNow);
        Assert.True(bench.Finished);
    }

    [Fact]
    public void A_resumed_coordinator_goes_on_with_the_next_round_from_the_state_that_was_journalled()
    {
        var first = CoordinatorBench.Asking(SmallPlan.Of(3, 1));
        first.AnswerAll(Enumerable.Range(0, 4));
        first.AnswerAll(Enumerable.Range(0, 3), 2);
        var last = first.LastAsked;
        Assert.Equal(new RoundId(1, 3), last.Id);

        var second = Resumed(first.Setup, last.Id, false, last.State);
        Assert.Equal([0, 1, 2, 3], second.AskedNow);
        Assert.All(second.Asks.Values, ask => Assert.Equal(new RoundId(1, 4), ask.Id));
        Assert.Equal(last.State.Consensus, second.LastAsked.State.Consensus);
        Assert.Equal(last.State.Dual, second.LastAsked.State.Dual);
        Assert.Equal(last.State.Dual[1], Assert.Single(second.Asks[1].Dual));
        var before = first.Journal.OfType<JournalEntry.RoundAsked>().Select(entry => entry.Id);
        Assert.DoesNotContain(second.LastAsked.Id, before);
    }

    [Fact]
    public void A_coordinator_resumed_after_a_closed_cycle_begins_the_next_one_and_welcomes_sites_to_it()
    {
        var first = CoordinatorBench.Asking(SmallPlan.Of(3, 1, cycles: 3));
        first.AnswerAll(Enumerable.Range(0, 4), 0);
        var end = first.Journal.OfType<JournalEntry.CycleClosed>().Single();
        var second = Resumed(first.Setup, new RoundId(1, 1), true, end.State);
        Assert.All(second.Asks.Values, ask => Assert.Equal(new RoundId(2, 1), ask.Id));
        Assert.All(second.Sent.Take(4), send => Assert.Equal(2, ((CoordinatorMessage.Welcomed)send.Message).Welcome.NextCycle));
    }

    [Fact]
    public void A_coordinator_that_crashed_in_the_last_round_allowed_asks_for_none_beyond_it()
    {
        var first = CoordinatorBench.Asking(SmallPlan.Of(3, 1, cycles: 2, roundCap: 2));
        first.AnswerAll(Enumerable.Range(0, 4));
        Assert.Equal(new RoundId(1, 2), first.LastAsked.Id);
        var second = Resumed(first.Setup, first.LastAsked.Id, false, first.LastAsked.State);
        var end = Assert.Single(second.Journal.OfType<JournalEntry.CycleClosed>());
        Assert.Equal((1, CycleEnd.RoundCap, 2), (end.Cycle, end.End, end.Rounds));
        Assert.Equal(new RoundId(2, 1), second.Asks[0].Id);
    }

    [Fact]
    public void A_coordinator_resumed_after_the_last_cycle_only_says_farewell()
    {
        var first = CoordinatorBench.Asking(SmallPlan.Of(3, 1));
        first.AnswerAll(Enumerable.Range(0, 4), 0);
        var end = first.Journal.OfType<JournalEntry.CycleClosed>().Single();
        var second = Resumed(first.Setup, new RoundId(1, 1), true, end.State);
        Assert.Empty(second.Asks);
        Assert.True(second.Finished);
        Assert.Equal(4, second.SentNow.Count(send => send.Message is CoordinatorMessage.Farewell));
    }

    [Fact]
    public void Resuming_after_the_start_is_an_error()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(2, 0));
        Assert.Throws<InvalidOperationException>(() => bench.Core.Resume(new RoundId(1, 1), false, bench.LastAsked.State));
    }

    [Fact]
    public void A_plan_in_which_no_bus_can_move_settles_in_one_round_a_cycle_and_says_what_is_unserved()
    {
        var small = SmallPlan.Of(0, 3, cycles: 2);
        var plant = new Generator("fixed", 0, 25, 25, 0, 10);
        var plan = small with { Network = new Network(100, small.Network.Buses, small.Network.Lines, [plant]) };
        var run = PlainRun.Of(plan);
        Assert.All(run.Cycles, cycle => Assert.Equal((CycleEnd.Settled, 1), (cycle.End, cycle.Rounds)));
        Assert.Equal(plan.LoadMw(1).Sum() - 25, run.Cycles[1].UnservedMw, 1e-6);
        Assert.Equal(25, Assert.Single(run.SetPointsMw(2)));
    }

    [Fact]
    public void A_site_alone_under_scheme_angle_has_nothing_to_agree_on_and_still_gets_its_set_points()
    {
        var small = SmallPlan.Of(2, 1);
        var buses = small.Network.Buses.Select(bus => bus with { Site = "s0" }).ToArray();
        var plan = small with
        {
            Cycles = 20_000,
            Scheme = new SchemeSettings { Kind = SchemeKind.Angle },
            Network = new Network(100, buses, small.Network.Lines, small.Network.Generators),
            Loads = new Dictionary<string, LoadSeries> { ["s0"] = new LoadSeries([], [small.LoadMw(1)]) },
        };
        var run = PlainRun.Of(plan);
        Assert.Equal(20_000, run.Cycles.Count);
        Assert.All(run.Cycles, cycle => Assert.Equal(CycleEnd.Settled, cycle.End));
        Assert.Equal(run.Optimum(1).CostPerHour, run.CostPerHour(20_000), 1e-3);
    }

    private static CoordinatorBench Resumed(CoordinatorSetup setup, RoundId last, bool cycleClosed, CoordinatorState state)
    {
        var bench = new CoordinatorBench(setup);
        bench.Core.Resume(last, cycleClosed, state);
        bench.Step(new CoordinatorInput.Started());
        bench.JoinAll();
        return bench;
    }
}
