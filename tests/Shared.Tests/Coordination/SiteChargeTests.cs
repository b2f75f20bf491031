using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Privacy;

namespace Halfvoice.Tests.Coordination;

/// <summary>SiteCore's ledger rows: when they are stored, what they cover, and what happens when the allowance ends.</summary>
public class SiteChargeTests
{
    [Fact]
    public void The_first_answer_of_a_block_carries_its_charge_and_the_others_none()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        var row = Assert.Single(bench.Ask(1, 1).Charges);
        Assert.Equal((1, 1, SiteCore.FirstBlock, ChargeState.Open), (row.Cycle, row.FirstRound, row.Answers, row.State));
        Assert.Equal(EpsilonUnits.PerOne / 50, row.EpsilonUnitsEach);
        for (var round = 2; round <= SiteCore.FirstBlock; round++)
        {
            var done = bench.Ask(1, round);
            Assert.Equal(new RoundId(1, round), done.Answer.Id);
            Assert.Empty(done.Charges);
        }

        var next = bench.Ask(1, 17).Charges;
        Assert.Equal([ChargeState.Settled, ChargeState.Open], next.Select(r => r.State));
        Assert.Equal((row.Id, 16), (next[0].Id, next[0].Used));
        Assert.Equal((17, 32), (next[1].FirstRound, next[1].Answers));
    }

    [Theory]
    [InlineData(0.9, 32)]
    [InlineData(1.1, 16)]
    [InlineData(4.1, 8)]
    public void Blocks_grow_where_rounds_are_quick_and_shrink_where_they_are_slow(double blockSeconds, int nextLength)
    {
        var bench = new SiteBench(SiteBench.Noisy(roundCap: 200), "s0");
        for (var round = 1; round <= SiteCore.FirstBlock; round++)
            bench.Ask(1, round);
        bench.Now += TimeSpan.FromSeconds(blockSeconds);
        Assert.Equal(nextLength, bench.Ask(1, SiteCore.FirstBlock + 1).Charges[^1].Answers);
    }

    [Fact]
    public void A_block_never_reaches_past_the_round_cap()
    {
        var bench = new SiteBench(SiteBench.Noisy(roundCap: 7), "s0");
        Assert.Equal(7, Assert.Single(bench.Ask(1, 1).Charges).Answers);
        Assert.Equal(5, Assert.Single(new SiteBench(SiteBench.Noisy(roundCap: 7), "s0").Ask(1, 3).Charges).Answers);
    }

    [Theory]
    [InlineData(true)]
    [InlineData(false)]
    public void The_end_of_a_cycle_and_a_stop_give_back_what_was_not_used(bool endOfCycle)
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        for (var round = 1; round <= 5; round++)
            bench.Ask(1, round);
        Assert.Equal(16, bench.AnswersCharged);
        var done = endOfCycle ? bench.End(1, 5) : bench.Step(new SiteInput.Stopping());
        var row = Assert.Single(done.Charges);
        Assert.Equal((1L, ChargeState.Settled, 5), (row.Id, row.State, row.Used));
        Assert.Equal(5, bench.AnswersCharged);
        Assert.Empty(bench.Step(new SiteInput.Stopping()).Charges);
    }

    [Fact]
    public void Rounds_given_back_are_not_answered_afterwards()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        bench.Ask(1, 1);
        bench.End(1, 1);
        var done = bench.Ask(1, 2);
        Assert.Equal(RefusalReason.OutOfOrder, done.Refusal.Reason);
        Assert.Empty(done.Charges);
        Assert.Equal(1, bench.AnswersCharged);
    }

    [Fact]
    public void A_malformed_outcome_is_refused_and_still_gives_back_what_was_not_used()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        bench.Ask(1, 1);
        var done = bench.Step(new SiteInput.Ended(new Outcome(1, CycleEnd.Settled, 1, [1, 2], [1, 2])));
        Assert.Equal(RefusalReason.Malformed, done.Refusal.Reason);
        Assert.Equal(1, Assert.Single(done.Charges).Used);
        Assert.Empty(done.SetPoints);
    }

    [Fact]
    public void An_allowance_that_is_spent_refuses_by_type_and_stays_spent_across_a_restart()
    {
        // A campaign of one cycle of 40 rounds is spent; a bundle for a longer one does not bring a new allowance.
        var bench = new SiteBench(SiteBench.Noisy(roundCap: 40, scope: PrivacyScope.Campaign), "s0");
        for (var round = 1; round <= 40; round++)
            Assert.Equal(round, bench.Ask(1, round).Answer.Id.Round);
        bench.End(1, 40);
        bench.Repack(campaignCycles: 4);
        for (var cycle = 2; cycle <= 3; cycle++)
        {
            var done = bench.Ask(cycle, 1);
            Assert.Equal(RefusalReason.BudgetSpent, done.Refusal.Reason);
            Assert.Equal(new RoundId(cycle, 1), done.Refusal.Id);
            Assert.Equal(ChargeState.Refused, Assert.Single(done.Charges).State);
        }

        bench.Restart();
        Assert.Equal(RefusalReason.BudgetSpent, bench.Ask(4, 1).Refusal.Reason);
        Assert.Equal(40, bench.AnswersCharged);
        Assert.Single(bench.Ledger.Values, row => row.State == ChargeState.Refused);
    }

    [Fact]
    public void A_refusal_is_final_for_its_period_and_the_next_period_begins_anew()
    {
        // A load-only site has one answer a cycle. A restart forfeits it.
        var bench = new SiteBench(SiteBench.Noisy(), "s3");
        bench.Ask(1, 1);
        bench.Restart();
        Assert.Equal(RefusalReason.BudgetSpent, bench.Ask(1, 2).Refusal.Reason);
        Assert.Equal(RefusalReason.BudgetSpent, bench.Ask(1, 3).Refusal.Reason);
        Assert.Equal(new RoundId(2, 1), bench.Ask(2, 1).Answer.Id);
    }

    [Fact]
    public void A_load_only_site_asked_again_in_a_cycle_repeats_its_numbers_at_no_charge()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s3");
        var first = bench.Ask(1, 1);
        Assert.Equal((1, EpsilonUnits.PerOne), (Assert.Single(first.Charges).Answers, first.Charges[0].EpsilonUnitsEach));
        for (var round = 2; round <= 4; round++)
        {
            var again = bench.Ask(1, round);
            Assert.Equal(first.Answer.Steps, again.Answer.Steps);
            Assert.Equal(new RoundId(1, round), again.Answer.Id);
            Assert.Empty(again.Charges);
        }

        var next = bench.Ask(2, 1);
        Assert.NotEqual(first.Answer.Steps, next.Answer.Steps);
        Assert.Equal([ChargeState.Settled, ChargeState.Open], next.Charges.Select(row => row.State));
    }

    [Fact]
    public void A_load_only_site_asked_for_moving_numbers_first_still_gives_its_data_in_the_right_length()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s3");
        Assert.Empty(bench.Step(new SiteInput.Asked(new Ask(new RoundId(1, 1), false, [], []))).Answer.Steps);
        Assert.Single(bench.Ask(1, 2).Answer.Steps);
        Assert.Equal(1, bench.AnswersCharged);
    }

    [Fact]
    public void Mechanism_none_charges_nothing()
    {
        var plan = SmallPlan.Of(2, 2);
        foreach (var site in plan.Network.Sites)
        {
            var bench = new SiteBench(plan, site);
            for (var round = 1; round <= 50; round++)
                Assert.Empty(bench.Ask(1, round).Charges);
            Assert.Empty(bench.End(1, 50).Charges);
        }
    }
}
