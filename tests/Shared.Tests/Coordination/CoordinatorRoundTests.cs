using Halfvoice.Coordination;

namespace Halfvoice.Tests.Coordination;

/// <summary>CoordinatorCore within a round: when it closes, what counts, and what changes nothing.</summary>
public class CoordinatorRoundTests
{
    [Fact]
    public void A_round_closes_with_the_last_answer_and_the_next_is_asked_in_the_same_step()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(3, 1));
        bench.Now += TimeSpan.FromSeconds(0.25);
        bench.AnswerAll([2, 0, 3]);
        Assert.DoesNotContain(bench.Journal, entry => entry is JournalEntry.RoundClosed);
        bench.Answer(1);
        var closed = bench.LastClosed;
        Assert.Equal(new RoundId(1, 1), closed.Id);
        Assert.Equal([2, 0, 3, 1], closed.Answers.Select(answer => answer.Site));
        Assert.Empty(closed.Held);
        Assert.Equal(0.25, closed.Seconds, 1e-9);

        // The load-only site is data from now on.
        Assert.Equal([0, 1, 2], bench.AskedNow);
        Assert.All(bench.SentNow, send => Assert.Equal(new RoundId(1, 2), ((CoordinatorMessage.Asked)send.Message).Ask.Id));
        Assert.All(bench.SentNow, send => Assert.False(((CoordinatorMessage.Asked)send.Message).Ask.Everything));
    }

    [Fact]
    public void What_is_asked_is_journalled_in_the_same_step_with_the_state_it_was_asked_from()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(3, 1));
        bench.AnswerAll([0, 1, 2, 3]);
        var entry = Assert.Single(bench.Stored.OfType<JournalEntry.RoundAsked>());
        Assert.Equal(bench.SentNow.Length, entry.Asks.Count);
        foreach (var (site, ask) in entry.Asks)
        {
            Assert.Equal(entry.State.Consensus[site], Assert.Single(ask.Consensus));
            Assert.Equal(entry.State.Dual[site], Assert.Single(ask.Dual));
        }

        Assert.True(Array.IndexOf(bench.Stored, bench.LastClosed) < Array.IndexOf(bench.Stored, entry));
    }

    [Fact]
    public void The_deadline_closes_a_round_that_has_its_quorum_and_holds_the_others()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0));
        bench.AnswerAll(Enumerable.Range(0, 9));
        Assert.DoesNotContain(bench.Journal, entry => entry is JournalEntry.RoundClosed);
        bench.WakeAfter(1.999);
        Assert.DoesNotContain(bench.Journal, entry => entry is JournalEntry.RoundClosed);
        bench.WakeAfter(0.001);
        Assert.Equal([9], bench.LastClosed.Held);
        Assert.Equal(2, bench.LastClosed.Seconds, 1e-9);
        Assert.Equal(10, bench.AskedNow.Count());
    }

    [Fact]
    public void A_held_site_keeps_its_last_numbers()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0));
        bench.AnswerAll(Enumerable.Range(0, 10), 3);
        var twin = CoordinatorBench.Asking(SmallPlan.Of(10, 0));
        twin.AnswerAll(Enumerable.Range(0, 10), 3);
        bench.AnswerAll(Enumerable.Range(0, 9), 4);
        bench.WakeAfter(2);
        twin.AnswerAll(Enumerable.Range(0, 9), 4);
        twin.Answer(9, 3);
        Assert.Equal(twin.LastAsked.State.Consensus, bench.LastAsked.State.Consensus);
        Assert.Equal(twin.LastAsked.State.Dual, bench.LastAsked.State.Dual);
        Assert.NotEqual(0, bench.LastAsked.State.Dual[9]);
    }

    [Fact]
    public void Under_the_quorum_the_deadline_ends_the_cycle_without_one()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0, cycles: 2));
        bench.AnswerAll(Enumerable.Range(0, 8));
        bench.WakeAfter(2);
        var end = Assert.Single(bench.Stored.OfType<JournalEntry.CycleClosed>());
        Assert.Equal((1, CycleEnd.NoQuorum), (end.Cycle, end.End));
        Assert.DoesNotContain(bench.Journal, entry => entry is JournalEntry.RoundClosed);
        Assert.Equal(10, bench.SentNow.Count(send => send.Message is CoordinatorMessage.Ended { Outcome.End: CycleEnd.NoQuorum }));
        Assert.All(bench.Asks.Values, ask => Assert.Equal(new RoundId(2, 1), ask.Id));
    }

    [Fact]
    public void A_refusal_counts_as_no_answer_and_is_journalled()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0));
        bench.AnswerAll(Enumerable.Range(0, 9));
        bench.Refuse(9);
        Assert.Contains(bench.Stored, entry => entry is JournalEntry.Refused { Site: 9, BySite: true, Refusal.Reason: RefusalReason.BudgetSpent });
        Assert.Equal([9], bench.LastClosed.Held);
        Assert.Equal(0, bench.LastClosed.Seconds);
        Assert.Equal(new RoundId(1, 2), bench.Asks[9].Id);
    }

    [Fact]
    public void When_all_have_spoken_but_too_few_answered_the_deadline_is_still_waited_for()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0));
        bench.AnswerAll(Enumerable.Range(0, 8));
        bench.Refuse(8);
        bench.Refuse(9);
        Assert.DoesNotContain(bench.Journal, entry => entry is JournalEntry.RoundClosed or JournalEntry.CycleClosed);
        bench.WakeAfter(2);
        Assert.Contains(bench.Stored, entry => entry is JournalEntry.CycleClosed { End: CycleEnd.NoQuorum });
    }

    [Fact]
    public void An_answer_that_came_too_late_twice_early_or_unasked_changes_nothing_and_is_journalled()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0));
        var late = bench.AnswerTo(9, 7);
        bench.AnswerAll(Enumerable.Range(0, 9));
        bench.WakeAfter(2);
        AssertIgnored(bench, 9, late);
        var again = bench.AnswerTo(0, 7);
        bench.Answer(0);
        AssertIgnored(bench, 0, again);
        AssertIgnored(bench, 1, bench.AnswerTo(1, 7) with { Id = new RoundId(1, 3) });
        AssertIgnored(bench, 1, bench.AnswerTo(1, 7) with { Id = new RoundId(2, 1) });
        bench.AnswerAll(Enumerable.Range(1, 9));
        Assert.All(bench.LastClosed.Answers, answer => Assert.Equal(1L << 30, Assert.Single(answer.Answer.Steps)));
        Assert.Equal(10, bench.LastClosed.Answers.Count);
    }

    [Fact]
    public void An_answer_of_a_site_that_was_not_asked_changes_nothing()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(3, 1));
        bench.AnswerAll([0, 1, 2, 3]);
        AssertIgnored(bench, 3, new Answer(new RoundId(1, 2), false, []));
    }

    [Fact]
    public void An_answer_of_the_wrong_length_is_refused_and_a_right_one_may_still_follow()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(3, 1));
        AssertRefused(bench, 0, bench.AnswerTo(0, 1) with { Steps = [] }, RefusalReason.Malformed);
        AssertRefused(bench, 0, bench.AnswerTo(0, 1) with { Steps = [1, 2] }, RefusalReason.Malformed);
        AssertRefused(bench, 0, bench.AnswerTo(0, 1) with { Everything = false }, RefusalReason.Malformed);
        bench.AnswerAll([0, 1, 2, 3]);
        Assert.Equal(4, bench.LastClosed.Answers.Count);
    }

    [Fact]
    public void An_answer_outside_the_public_bounds_is_refused()
    {
        // Bound: twice the installed 300 MW; no noise was declared.
        var bench = CoordinatorBench.Asking(SmallPlan.Of(3, 1));
        AssertRefused(bench, 0, bench.AnswerTo(0, 1) with { Steps = [(600L << 30) + 1] }, RefusalReason.OutOfRange);
        AssertRefused(bench, 0, bench.AnswerTo(0, 1) with { Steps = [long.MinValue] }, RefusalReason.OutOfRange);
        bench.Step(new CoordinatorInput.AnswerArrived(0, bench.AnswerTo(0, 1) with { Steps = [-600L << 30] }));
        Assert.Empty(bench.Stored);
    }

    [Fact]
    public void Declared_noise_widens_the_bounds_by_a_hundred_scales()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(2, 0));
        bench.Step(new CoordinatorInput.Started());
        bench.Step(new CoordinatorInput.SiteJoined(0, bench.Enrol(noiseScale: 2)));
        bench.Join(1);
        AssertRefused(bench, 0, bench.AnswerTo(0, 1) with { Steps = [(600L << 30) + 1] }, RefusalReason.OutOfRange);
        bench.Step(new CoordinatorInput.AnswerArrived(0, bench.AnswerTo(0, 1) with { Steps = [600L << 30] }));
        Assert.Empty(bench.Stored);
    }

    private static void AssertIgnored(CoordinatorBench bench, int site, Answer answer)
    {
        var at = bench.Core.WakeAt;
        bench.Step(new CoordinatorInput.AnswerArrived(site, answer));
        var entry = Assert.IsType<JournalEntry.Refused>(Assert.Single(bench.Stored));
        Assert.Equal((site, false, RefusalReason.OutOfOrder, answer.Id), (entry.Site, entry.BySite, entry.Refusal.Reason, entry.Refusal.Id));
        Assert.Empty(bench.SentNow);
        Assert.Equal(at, bench.Core.WakeAt);
    }

    private static void AssertRefused(CoordinatorBench bench, int site, Answer answer, RefusalReason reason)
    {
        bench.Step(new CoordinatorInput.AnswerArrived(site, answer));
        var entry = Assert.IsType<JournalEntry.Refused>(Assert.Single(bench.Stored));
        Assert.Equal((site, false, reason), (entry.Site, entry.BySite, entry.Refusal.Reason));
        var (to, message) = Assert.Single(bench.SentNow);
        Assert.Equal(site, to);
        Assert.Equal(reason, Assert.IsType<CoordinatorMessage.Refused>(message).Refusal.Reason);
    }
}
