using System.Globalization;
using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>What a site lets out: noise of the size it declares, and never a load in words.</summary>
public class SitePrivacyTests
{
    [Fact]
    public void An_enrolment_says_how_to_read_the_answers_and_what_they_cost()
    {
        var plan = SiteBench.Noisy(roundCap: 50, epsilon: 2);
        var setups = new SetupBuilder(plan);
        var enrol = new SiteBench(plan, "s0").Core.Enrolment();
        Assert.Equal(setups.Coordinator.SetupDigest, enrol.SetupDigest);
        Assert.Equal(0.04, enrol.EpsilonPerAnswer, 1e-12);
        Assert.Equal(RoundId.None, enrol.AnsweredThrough);

        // Adjacency 1 MW at ε 0.04: 25 MW, and not a hair less.
        Assert.InRange(enrol.NoiseScale, 25, 25.001);
        Assert.InRange(Math.ScaleB(1, enrol.LatticeExponent), 1e-13, 1e-9);

        // A load-only site spends the cycle's ε on one answer.
        var once = new SiteBench(plan, "s3").Core.Enrolment();
        Assert.Equal(2, once.EpsilonPerAnswer, 1e-12);
        Assert.InRange(once.NoiseScale, 0.5, 0.50001);
    }

    [Fact]
    public void An_enrolment_without_noise_declares_none()
    {
        var enrol = new SiteBench(SmallPlan.Of(2, 2), "s0").Core.Enrolment();
        Assert.Equal((-30, 0.0, 0.0), (enrol.LatticeExponent, enrol.NoiseScale, enrol.EpsilonPerAnswer));
    }

    [Fact]
    public void An_enrolment_in_mid_run_names_the_last_round_that_was_answered()
    {
        var bench = new SiteBench(SiteBench.Noisy(), "s0");
        bench.Ask(1, 3);
        Assert.Equal(new RoundId(1, 3), bench.Core.Enrolment().AnsweredThrough);
    }

    [Fact]
    public void Without_noise_the_answer_is_the_site_problem_rounded_to_the_lattice()
    {
        var bench = new SiteBench(SmallPlan.Of(2, 2), "s0");
        var exact = ExactAnswer(bench, bench.Asking(1, 1, 7, -25));
        Assert.Equal(exact, Math.ScaleB((double)Assert.Single(bench.Ask(1, 1, 7, -25).Answer.Steps), -30), Math.ScaleB(0.5, -30));
    }

    /// <summary>
    /// The mean distance of 4,000 answers from the exact one is the scale; its standard error is 1.6 % of the scale, so ±8 % is
    /// five of them. The source is seeded: the test cannot flicker. One fresh seed in about 2 million would fail it.
    /// </summary>
    [Theory]
    [InlineData(1)]
    [InlineData(2)]
    public void Each_answer_carries_fresh_noise_of_the_declared_scale(ulong seed)
    {
        const int answers = 4000;
        var bench = new SiteBench(SiteBench.Noisy(roundCap: answers, epsilon: 1000), "s0", seed);
        var enrol = bench.Core.Enrolment();
        var exact = ExactAnswer(bench, bench.Asking(1, 1, 7, -25));
        var off = new double[answers];
        for (var round = 1; round <= answers; round++)
            off[round - 1] = Math.ScaleB((double)bench.Ask(1, round, 7, -25).Answer.Steps[0], enrol.LatticeExponent) - exact;
        Assert.InRange(off.Average(Math.Abs) / enrol.NoiseScale, 0.92, 1.08);
        Assert.InRange(off.Average() / enrol.NoiseScale, -0.12, 0.12);
        Assert.Equal(answers, off.Distinct().Count());
    }

    [Fact]
    public void Another_seed_gives_other_answers_and_the_same_seed_the_same()
    {
        var plan = SiteBench.Noisy();
        Assert.Equal(new SiteBench(plan, "s0", 4).Ask(1, 1).Answer.Steps, new SiteBench(plan, "s0", 4).Ask(1, 1).Answer.Steps);
        Assert.NotEqual(new SiteBench(plan, "s0", 4).Ask(1, 1).Answer.Steps, new SiteBench(plan, "s0", 5).Ask(1, 1).Answer.Steps);
    }

    [Fact]
    public void No_refusal_and_no_exception_contains_a_load()
    {
        // The loads are 10.618033 MW and so on: neither the number nor its digits may show.
        foreach (var (plan, site) in new[] { (SiteBench.Noisy(), "s0"), (SiteBench.Noisy(), "s3"), (SmallPlan.Of(2, 2), "s0") })
        {
            var bench = new SiteBench(plan, site);
            var said = new List<string>();
            Hear(bench.Ask(1, 51), said);
            Hear(bench.Ask(1, 1), said);
            Hear(bench.Ask(1, 1, 9, 9), said);
            Hear(bench.Ask(1, 3), said);
            Hear(bench.Ask(1, 2), said);
            Hear(bench.Step(new SiteInput.Asked(bench.Asking(1, 4) with { Dual = [double.NaN, 1, 2] })), said);
            Hear(bench.Step(new SiteInput.Ended(new Outcome(1, CycleEnd.Settled, 3, [1, 2, 3], [1, 2, 3]))), said);
            bench.Restart();
            Hear(bench.Ask(1, 2), said);
            Hear(bench.Ask(1, 40), said);
            bench.HasReading = false;
            Hear(bench.Ask(9, 1), said);
            Assert.True(said.Count >= 5, "Too few refusals were heard to tell anything.");
            Assert.All(said, text => Assert.DoesNotContain("618033", text, StringComparison.Ordinal));
        }
    }

    [Theory]
    [InlineData(double.NaN)]
    [InlineData(double.PositiveInfinity)]
    public void A_reading_that_is_no_number_is_refused_in_words_without_the_loads_beside_it(double bad)
    {
        var plan = SmallPlan.Of(2, 2);
        var buses = plan.Network.Buses.Select((bus, b) => bus with { Site = b < 2 ? "s0" : "s1" }).ToArray();
        plan = plan with
        {
            Network = new Grid.Network(100, buses, plan.Network.Lines, plan.Network.Generators),
            Loads = new Dictionary<string, LoadSeries>
            {
                ["s0"] = new LoadSeries([], [[10.618033, bad]]),
                ["s1"] = new LoadSeries([], [[1, 1]]),
            },
        };
        var bench = new SiteBench(plan, "s0");
        var refusal = bench.Ask(1, 1).Refusal;
        Assert.Equal(RefusalReason.NoReading, refusal.Reason);
        Assert.DoesNotContain("618033", refusal.Text, StringComparison.Ordinal);
    }

    private static double ExactAnswer(SiteBench bench, Ask ask)
    {
        var values = new double[1];
        SiteSchemes.Create(bench.Setup).Solve([SmallPlan.LoadMw(bench.Setup.Site)], ask, values);
        return values[0];
    }

    private static void Hear(SiteDone done, List<string> said)
    {
        if (done.Reply is SiteReply.Refused refused)
            said.Add(refused.Refusal.ToString() + string.Create(CultureInfo.InvariantCulture, $" {refused.Refusal.Text}"));
    }
}
