using Halfvoice.Coordination;

namespace Halfvoice.Tests.Coordination;

/// <summary>CoordinatorCore when sites leave, stay away and come back.</summary>
public class CoordinatorPresenceTests
{
    [Fact]
    public void An_answer_is_held_for_hold_rounds_and_one_more_round_away_loses_the_site()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0, cycles: 2, holdRounds: 3));
        bench.AnswerAll(Enumerable.Range(0, 10));
        for (var held = 1; held <= 4; held++)
        {
            bench.AnswerAll(Enumerable.Range(0, 9));
            bench.WakeAfter(2);
            Assert.Equal([9], bench.LastClosed.Held);
            Assert.Equal(held > 3, bench.Stored.OfType<JournalEntry.CycleClosed>().Any());
        }

        Assert.Contains(bench.Stored, entry => entry is JournalEntry.CycleClosed { End: CycleEnd.SiteLost, Rounds: 5 });
        Assert.Equal(new RoundId(2, 1), bench.Asks[9].Id);
    }

    [Fact]
    public void One_answer_in_between_starts_the_count_anew_and_so_does_a_new_cycle()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0, cycles: 3, roundCap: 8, holdRounds: 3));
        for (var round = 1; round <= 16; round++)
        {
            var answersToo = round is 1 or 5 or 12;
            bench.AnswerAll(Enumerable.Range(0, answersToo ? 10 : 9));
            if (!answersToo)
                bench.WakeAfter(2);
        }

        Assert.Equal([CycleEnd.RoundCap, CycleEnd.SiteLost], bench.Journal.OfType<JournalEntry.CycleClosed>().Select(entry => entry.End));
        Assert.Equal([8, 8], bench.Journal.OfType<JournalEntry.CycleClosed>().Select(entry => entry.Rounds));
    }

    [Fact]
    public void A_site_that_leaves_without_answering_is_not_waited_for()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0));
        bench.AnswerAll(Enumerable.Range(0, 9));
        bench.Step(new CoordinatorInput.SiteLeft(9));
        Assert.Equal(new JournalEntry.SiteLeft(9), bench.Stored[0]);
        Assert.Equal([9], bench.LastClosed.Held);
        Assert.Equal(Enumerable.Range(0, 9), bench.AskedNow);
    }

    [Fact]
    public void A_site_that_leaves_after_answering_has_answered()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0));
        bench.Answer(9);
        bench.Step(new CoordinatorInput.SiteLeft(9));
        bench.AnswerAll(Enumerable.Range(0, 9));
        Assert.Empty(bench.LastClosed.Held);
        Assert.Equal(10, bench.LastClosed.Answers.Count);
    }

    [Fact]
    public void A_site_that_left_is_sent_nothing_and_its_second_leaving_is_nothing_new()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0, roundCap: 2));
        bench.Step(new CoordinatorInput.SiteLeft(9));
        var before = bench.Sent.Count;
        bench.Step(new CoordinatorInput.SiteLeft(9));
        Assert.Empty(bench.Stored);
        bench.AnswerAll(Enumerable.Range(0, 9));
        bench.AnswerAll(Enumerable.Range(0, 9));
        Assert.True(bench.Finished);
        Assert.DoesNotContain(bench.Sent.Skip(before), send => send.Site == 9);
    }

    [Fact]
    public void A_site_that_comes_back_is_asked_in_the_next_round_and_not_in_the_open_one()
    {
        var bench = CoordinatorBench.Asking(SmallPlan.Of(10, 0));
        bench.Step(new CoordinatorInput.SiteLeft(9));
        bench.Join(9, new RoundId(0, 0));
        Assert.IsType<CoordinatorMessage.Welcomed>(Assert.Single(bench.SentNow).Message);
        bench.AnswerAll(Enumerable.Range(0, 9));
        Assert.Equal([9], bench.LastClosed.Held);
        Assert.Equal(Enumerable.Range(0, 10), bench.AskedNow);
        Assert.True(bench.Asks[9].Everything);
        Assert.False(bench.Asks[0].Everything);
    }

    [Fact]
    public void No_site_is_asked_for_a_round_that_it_may_have_answered()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(10, 0, cycles: 2, roundCap: 6));
        bench.Step(new CoordinatorInput.Started());
        for (var s = 0; s < 9; s++)
            bench.Join(s);
        bench.Join(9, new RoundId(1, 2));
        for (var round = 1; round <= 6; round++)
        {
            Assert.Equal(round > 2, bench.AskedNow.Contains(9));
            bench.AnswerAll(bench.AskedNow);
        }

        Assert.Contains(9, bench.AskedNow);
        Assert.Equal(new RoundId(2, 1), bench.Asks[9].Id);
    }

    [Fact]
    public void Nobody_who_is_missing_lets_a_cycle_settle_before_all_data_are_known()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(9, 1, holdRounds: 2));
        bench.Step(new CoordinatorInput.Started());
        for (var s = 0; s < 9; s++)
            bench.Join(s);
        bench.WakeAfter(CoordinatorCore.GatherSeconds);
        bench.AnswerAll(Enumerable.Range(0, 9), 0);
        Assert.Equal(0, bench.LastClosed.Measure.MismatchMw);
        Assert.DoesNotContain(bench.Journal, entry => entry is JournalEntry.CycleClosed);
        bench.Join(9);
        bench.AnswerAll(Enumerable.Range(0, 9), 0);
        Assert.Contains(9, bench.AskedNow);
        bench.AnswerAll(Enumerable.Range(0, 10), 0);
        Assert.Contains(bench.Stored, entry => entry is JournalEntry.CycleClosed { End: CycleEnd.Settled });
    }
}
