using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>SiteCore's answers: same ask same bytes, another ask none, and nothing twice after a restart.</summary>
public class SiteAnswerTests
{
    [Fact]
    public void The_same_ask_gets_the_same_steps_again_at_no_charge()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        var first = bench.Ask(1, 1, 3, 20).Answer;
        var second = bench.Ask(1, 2, 3, 20).Answer;
        Assert.NotEqual(first.Steps, second.Steps);
        foreach (var (round, answer) in new[] { (1, first), (2, second), (1, first) })
        {
            var again = bench.Ask(1, round, 3, 20);
            Assert.Equal(answer.Steps, again.Answer.Steps);
            Assert.Equal(answer.Id, again.Answer.Id);
            Assert.Empty(again.Charges);
        }
    }

    [Fact]
    public void The_same_round_with_any_other_number_is_refused()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        bench.Ask(1, 1, 3, 20);
        Ask[] others =
        [
            bench.Asking(1, 1, Math.BitIncrement(3), 20),
            bench.Asking(1, 1, 3, Math.BitDecrement(20)),
            bench.Asking(1, 1, 3, 20) with { Everything = false },
            bench.Asking(1, 1, 20, 3),
        ];
        foreach (var other in others)
        {
            var done = bench.Step(new SiteInput.Asked(other));
            Assert.Equal(RefusalReason.AskChanged, done.Refusal.Reason);
            Assert.Empty(done.Charges);
        }
    }

    [Fact]
    public void A_round_that_was_passed_over_is_not_answered_later()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        bench.Ask(1, 5);
        Assert.Equal(RefusalReason.OutOfOrder, bench.Ask(1, 4).Refusal.Reason);
        bench.Ask(2, 1);
        Assert.Equal(RefusalReason.OutOfOrder, bench.Ask(1, 6).Refusal.Reason);
    }

    [Fact]
    public void After_a_restart_every_round_that_may_have_been_answered_is_forfeited()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        bench.Ask(1, 1, 3, 20);
        bench.Ask(1, 2, 3, 20);
        bench.Restart();
        Assert.Equal(Halfvoice.Privacy.ChargeState.Forfeited, Assert.Single(bench.Ledger.Values).State);
        Assert.Equal(new RoundId(1, 16), bench.Core.Enrolment().AnsweredThrough);
        for (var round = 1; round <= 16; round++)
            Assert.Equal(RefusalReason.Forfeited, bench.Ask(1, round, 3, 20).Refusal.Reason);
        Assert.Equal(new RoundId(1, 17), bench.Ask(1, 17, 3, 20).Answer.Id);
        Assert.Equal(32, bench.AnswersCharged);
    }

    [Fact]
    public void A_site_that_stopped_in_good_order_forfeits_its_block_of_rounds_but_not_its_allowance()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        bench.Ask(1, 1);
        bench.Step(new SiteInput.Stopping());
        bench.Restart();
        Assert.Equal(RefusalReason.Forfeited, bench.Ask(1, 1).Refusal.Reason);
        Assert.Equal(1, bench.AnswersCharged);
        Assert.Equal(new RoundId(2, 1), bench.Ask(2, 1).Answer.Id);
    }

    [Fact]
    public void A_round_beyond_the_cap_or_before_the_first_is_refused_without_a_charge()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        foreach (var (cycle, round) in new[] { (1, 51), (1, int.MaxValue), (1, 0), (1, -1), (0, 1), (-3, 2), (0, 0) })
        {
            var done = bench.Ask(cycle, round);
            Assert.Equal(RefusalReason.OutOfRange, done.Refusal.Reason);
            Assert.Empty(done.Charges);
        }

        Assert.Equal(new RoundId(1, 50), bench.Ask(1, 50).Answer.Id);
    }

    [Fact]
    public void A_malformed_ask_is_refused_without_a_charge()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        var good = bench.Asking(1, 1);
        AssertRefused(good with { Consensus = [] }, RefusalReason.Malformed);
        AssertRefused(good with { Dual = [1, 2] }, RefusalReason.Malformed);
        AssertRefused(good with { Consensus = [1, 2], Dual = [1, 2] }, RefusalReason.Malformed);
        foreach (var number in new[] { double.NaN, double.PositiveInfinity, double.NegativeInfinity })
        {
            AssertRefused(good with { Consensus = [number] }, RefusalReason.OutOfRange);
            AssertRefused(good with { Dual = [number] }, RefusalReason.OutOfRange);
        }

        Assert.Equal(good.Id, bench.Step(new SiteInput.Asked(good)).Answer.Id);

        void AssertRefused(Ask ask, RefusalReason reason)
        {
            var done = bench.Step(new SiteInput.Asked(ask));
            Assert.Equal(reason, done.Refusal.Reason);
            Assert.Empty(done.Charges);
        }
    }

    [Fact]
    public void An_outcome_with_a_number_that_is_not_finite_leaves_no_set_point()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        bench.Ask(1, 1);
        var done = bench.End(1, 1, consensus: double.NaN);
        Assert.Empty(done.SetPoints);
        Assert.Equal(RefusalReason.OutOfRange, done.Refusal.Reason);
    }

    [Fact]
    public void Without_a_reading_nothing_is_answered_or_charged_and_the_round_may_be_asked_again()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0") { HasReading = false };
        var done = bench.Ask(1, 1);
        Assert.Equal(RefusalReason.NoReading, done.Refusal.Reason);
        Assert.Empty(done.Charges);
        bench.HasReading = true;
        Assert.Equal(new RoundId(1, 1), bench.Ask(1, 1).Answer.Id);
    }

    [Theory]
    [InlineData(CycleEnd.Settled, true)]
    [InlineData(CycleEnd.RoundCap, false)]
    [InlineData(CycleEnd.NoQuorum, false)]
    [InlineData(CycleEnd.SiteLost, false)]
    [InlineData(CycleEnd.Stopped, false)]
    public void Set_points_follow_the_outcome_and_are_accepted_only_where_the_cycle_settled(CycleEnd end, bool accepted)
    {
        var bench = new SiteBench(SmallPlan.Of(2, 2), "s1");
        bench.Ask(1, 1);
        var point = Assert.Single(bench.End(1, 1, end, consensus: 5).SetPoints);
        Assert.Equal((1, "g1", accepted), (point.Cycle, point.Generator, point.Accepted));
        Assert.Equal(5 + SmallPlan.LoadMw("s1"), point.Mw, 1e-12);
        Assert.Equal(100, Assert.Single(bench.End(1, 1, end, consensus: 1e6).SetPoints).Mw);
        Assert.Equal(0, Assert.Single(bench.End(1, 1, end, consensus: -1e6).SetPoints).Mw);
    }

    [Fact]
    public void A_cycle_without_rounds_leaves_no_set_point() =>
        Assert.Empty(new SiteBench(SmallPlan.Of(2, 2), "s1").End(1, 0, CycleEnd.Stopped).SetPoints);

    [Theory]
    [InlineData(SchemeKind.Injection)]
    [InlineData(SchemeKind.Angle)]
    public void The_wildest_asks_and_outcomes_get_a_bounded_answer(SchemeKind kind)
    {
        var plan = InventedPlans.Make(4, 5, 3, 1) with { Scheme = new SchemeSettings { Kind = kind } };
        plan = plan with
        {
            Privacy = new PrivacySettings { Mechanism = MechanismKind.None, Stated = true },
            Stop = plan.Stop with { RoundCap = 40 },
        };
        var random = new Random(7);
        foreach (var one in new[] { plan, SmallPlan.Of(2, 2) with { Scheme = plan.Scheme } })
        {
            foreach (var site in one.Network.Sites)
            {
                var bench = new SiteBench(one, site);
                var bound = SiteSchemes.Create(bench.Setup).Bound;
                int round;
                for (round = 1; round <= 40; round++)
                {
                    var ask = bench.Asking(1, round, 1, 1);
                    var wild = ask with { Consensus = Wild(ask.Consensus.Length), Dual = Wild(ask.Dual.Length) };
                    var answer = bench.Step(new SiteInput.Asked(wild)).Answer;
                    Assert.All(answer.Steps, steps => Assert.InRange(
                        Math.ScaleB(steps, bench.Core.Enrolment().LatticeExponent), -bound - 1e-6, bound + 1e-6));
                    var count = SiteSchemes.Create(bench.Setup).ComponentCount;
                    var points = bench.Step(new SiteInput.Ended(new Outcome(1, CycleEnd.Settled, round, Wild(count), Wild(count)))).SetPoints;
                    Assert.All(points, point => Assert.True(IsWithinLimits(bench.Setup, point)));
                }
            }
        }

        // Any finite number, evenly spread over all magnitudes, or an ordinary one.
        double[] Wild(int count) => Enumerable.Range(0, count).Select(_ => random.Next(3) switch
        {
            0 => random.NextDouble() - 0.5,
            1 => Math.CopySign(Math.ScaleB(1 + random.NextDouble(), random.Next(-1000, 1023)), random.Next(2) - 0.5),
            _ => Math.CopySign(double.MaxValue, random.Next(2) - 0.5),
        }).ToArray();
    }

    private static bool IsWithinLimits(SiteSetup setup, SetPoint point)
    {
        var plant = setup.Generators.Single(g => g.Name == point.Generator);
        return point.Mw >= plant.MinMw - 1e-6 && point.Mw <= plant.MaxMw + 1e-6;
    }
}
