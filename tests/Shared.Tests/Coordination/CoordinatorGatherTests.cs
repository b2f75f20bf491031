using Halfvoice.Coordination;

namespace Halfvoice.Tests.Coordination;

/// <summary>CoordinatorCore before the first round: who may join, and when the first ask leaves.</summary>
public class CoordinatorGatherTests
{
    [Fact]
    public void Nothing_is_asked_until_the_last_site_has_joined_and_then_all_are_asked_at_once()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(3, 2));
        bench.Step(new CoordinatorInput.Started());
        for (var s = 0; s < 4; s++)
        {
            bench.Join(s);
            Assert.Equal(1, Assert.IsType<CoordinatorMessage.Welcomed>(Assert.Single(bench.SentNow).Message).Welcome.NextCycle);
        }

        bench.Join(4);
        Assert.Equal([0, 1, 2, 3, 4], bench.AskedNow);
        Assert.All(bench.Asks.Values, ask => Assert.Equal(new RoundId(1, 1), ask.Id));
        Assert.All(bench.Asks.Values, ask => Assert.True(ask.Everything));
        Assert.Equal(bench.Now + TimeSpan.FromSeconds(2), bench.Core.WakeAt);
    }

    [Fact]
    public void After_thirty_seconds_a_quorum_is_enough()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(9, 1));
        bench.Step(new CoordinatorInput.Started());
        for (var s = 0; s < 9; s++)
            bench.Join(s);
        Assert.Empty(bench.Asks);
        bench.WakeAfter(CoordinatorCore.GatherSeconds);
        Assert.Equal(9, bench.AskedNow.Count());
        bench.AnswerAll(bench.AskedNow);
        Assert.Equal([9], bench.LastClosed.Held);
    }

    [Fact]
    public void Under_the_quorum_it_waits_another_thirty_seconds_and_another()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(9, 1));
        bench.Step(new CoordinatorInput.Started());
        for (var s = 0; s < 8; s++)
            bench.Join(s);
        for (var i = 0; i < 3; i++)
        {
            bench.WakeAfter(CoordinatorCore.GatherSeconds);
            Assert.DoesNotContain(bench.Sent, send => send.Message is CoordinatorMessage.Asked);
            Assert.Equal(bench.Now + TimeSpan.FromSeconds(CoordinatorCore.GatherSeconds), bench.Core.WakeAt);
        }

        bench.Join(8);
        Assert.Empty(bench.AskedNow);
        bench.WakeAfter(CoordinatorCore.GatherSeconds);
        Assert.Equal(9, bench.AskedNow.Count());
    }

    [Fact]
    public void A_wake_before_its_time_changes_nothing()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(9, 1));
        bench.Step(new CoordinatorInput.Started());
        for (var s = 0; s < 9; s++)
            bench.Join(s);
        var at = bench.Core.WakeAt;
        bench.WakeAfter(CoordinatorCore.GatherSeconds - 0.001);
        Assert.Empty(bench.Stored);
        Assert.Empty(bench.SentNow);
        Assert.Equal(at, bench.Core.WakeAt);
    }

    [Fact]
    public void A_second_stream_of_a_site_is_refused_and_journalled_while_the_first_one_lives()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(2, 1));
        bench.Step(new CoordinatorInput.Started());
        bench.Join(0);
        bench.Join(0);
        AssertRefused(bench, 0, RefusalReason.AlreadyJoined);
        bench.Step(new CoordinatorInput.SiteLeft(0));
        bench.Join(0);
        Assert.IsType<CoordinatorMessage.Welcomed>(Assert.Single(bench.SentNow).Message);
    }

    [Fact]
    public void A_site_with_another_bundle_is_refused_and_does_not_count_as_joined()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(1, 1));
        bench.Step(new CoordinatorInput.Started());
        bench.Join(0);
        bench.Step(new CoordinatorInput.SiteJoined(1, bench.Enrol() with { SetupDigest = "0" + bench.Setup.SetupDigest[1..^1] + "x" }));
        AssertRefused(bench, 1, RefusalReason.NotOurPlan);
        Assert.Empty(bench.Asks);
        bench.Join(1);
        Assert.Equal([0, 1], bench.AskedNow);
    }

    [Fact]
    public void A_stop_while_gathering_says_farewell_to_those_who_came()
    {
        var bench = new CoordinatorBench(SmallPlan.Of(3, 0));
        bench.Step(new CoordinatorInput.Started());
        bench.Join(1);
        bench.Step(new CoordinatorInput.StopAsked());
        var (site, message) = Assert.Single(bench.SentNow);
        Assert.Equal(1, site);
        Assert.IsType<CoordinatorMessage.Farewell>(message);
        Assert.True(bench.Finished);
        Assert.Null(bench.Core.WakeAt);
    }

    private static void AssertRefused(CoordinatorBench bench, int site, RefusalReason reason)
    {
        var entry = Assert.IsType<JournalEntry.Refused>(Assert.Single(bench.Stored));
        Assert.Equal((site, false, reason), (entry.Site, entry.BySite, entry.Refusal.Reason));
        var (to, message) = Assert.Single(bench.SentNow);
        Assert.Equal(site, to);
        Assert.Equal(entry.Refusal, Assert.IsType<CoordinatorMessage.Refused>(message).Refusal);
    }
}
