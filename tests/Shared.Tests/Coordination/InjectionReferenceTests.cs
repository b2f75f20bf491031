using System.Text.Json;
using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>
/// Scheme injection round by round against the reference study. Tolerance: ten times what another internal scaling moves the
/// reference by, 4e-6 MW, on x, z and u/ρ; the lattice without noise (2⁻³⁰ MW) is far below it.
/// </summary>
public class InjectionReferenceTests
{
    private const double ToleranceMw = 4e-5;

    [Theory]
    [InlineData("ieee-14")]
    [InlineData("ieee-118")]
    public void Every_ask_answer_and_consensus_is_the_references_and_so_is_the_round_that_settles(string name)
    {
        using var trace = ReferenceTrace.Injection(name, 60);
        var cycle = trace.RootElement.GetProperty("cycles")[0];
        var rounds = cycle.GetProperty("rounds");
        var plan = ReferenceTrace.Plan(name);
        plan = plan with { Stop = new StopSettings { ReferenceLoadMw = plan.LoadMw(1).Sum(), RoundCap = 60 } };
        var run = PlainRun.Of(plan);
        var asked = run.Journal.OfType<JournalEntry.RoundAsked>().ToArray();
        var closed = run.Journal.OfType<JournalEntry.RoundClosed>().ToArray();
        var end = run.Journal.OfType<JournalEntry.CycleClosed>().Single();
        Assert.True(rounds[rounds.GetArrayLength() - 1].GetProperty("settled").GetBoolean());
        Assert.Equal(CycleEnd.Settled, end.End);
        Assert.Equal(rounds.GetArrayLength(), end.Rounds);
        for (var r = 0; r < closed.Length; r++)
        {
            var round = rounds[r];
            Assert.Equal(r == closed.Length - 1, round.GetProperty("settled").GetBoolean());
            AssertAsks(run, asked[r], round.GetProperty("asks"));
            AssertAnswers(run, closed[r], round.GetProperty("answers").GetProperty("x_mw"));
            AssertConsensus(run, r + 1 < asked.Length ? asked[r + 1].State : end.State, round.GetProperty("z_mw"));
        }
    }

    [Theory]
    [InlineData("ieee-14")]
    [InlineData("ieee-118")]
    public void The_price_scale_and_every_penalty_are_the_references(string name)
    {
        using var trace = ReferenceTrace.Injection(name, 1);
        var setups = new SetupBuilder(ReferenceTrace.Plan(name));
        Assert.Equal(trace.RootElement.GetProperty("price_scale").GetDouble(), setups.PriceScalePerMwh, 1e-12);
        var rho = trace.RootElement.GetProperty("rho");
        foreach (var site in setups.Coordinator.Sites)
        {
            var penalty = Assert.Single(site.Components).Penalty;
            Assert.Equal(rho.TryGetProperty(site.Name, out var expected) ? expected.GetDouble() : 0, penalty, 1e-12);
        }

        Assert.Equal(rho.EnumerateObject().Count(), setups.Coordinator.Sites.Count(site => site.Components[0].Penalty > 0));
    }

    [Theory]
    [InlineData("ieee-14", 4, 6)]
    [InlineData("ieee-118", 8, 50)]
    public void Cost_gap_and_mismatch_stay_small_from_the_measured_rounds_on(string name, int roundsToOne, int roundsToTenth)
    {
        var plan = PlainRun.Tightened(ReferenceTrace.Plan(name), SchemeKind.Injection, 1e-12, 1e-12, 150);
        var run = PlainRun.Of(plan);
        var scores = Scores(run).ToArray();

        // A run that ends before the cap has stopped moving to within 1e-12 MW: all later rounds would be its last one.
        Assert.True(scores.Length == 150 || run.Cycles[0].End == CycleEnd.Settled);
        Assert.Equal(roundsToOne, From(scores, 0.01, 0.02));
        Assert.Equal(roundsToTenth, From(scores, 0.001, 0.01));
    }

    /// <summary>Cost gap of the schedule clip(z + d) as it stands and Σ |p − d − z| / Σ d, by round, as fractions.</summary>
    private static IEnumerable<(double Gap, double Mismatch)> Scores(PlainRun run)
    {
        var network = run.Plan.Network;
        var optimum = run.Optimum(1).CostPerHour;
        var sites = network.Sites.Select(site => (Setup: run.Setups.ForSite(site), Load: run.Plan.Loads[site].At(1))).ToArray();
        var schemes = sites.Select(site => new InjectionSite(site.Setup)).ToArray();
        var states = run.Journal.OfType<JournalEntry.RoundAsked>().Skip(1).Select(entry => entry.State)
            .Append(run.Journal.OfType<JournalEntry.CycleClosed>().Single().State);
        foreach (var state in states)
        {
            double cost = 0, mismatch = 0;
            for (var s = 0; s < sites.Length; s++)
            {
                var plants = sites[s].Setup.Generators;
                var output = new double[plants.Count];
                schemes[s].Dispatch(sites[s].Load, new Outcome(1, CycleEnd.Settled, 1, [state.Consensus[s]], [state.Dual[s]]), output);
                for (var g = 0; g < output.Length; g++)
                    cost += (((plants[g].CostQuadratic * output[g]) + plants[g].CostLinear) * output[g]) + plants[g].CostFixed;
                mismatch += Math.Abs(output.Sum() - sites[s].Load[0] - state.Consensus[s]);
            }

            yield return ((cost / optimum) - 1, mismatch / run.Plan.LoadMw(1).Sum());
        }
    }

    /// <summary>The first round from which both measures stay below their limits to the end of the run.</summary>
    private static int From((double Gap, double Mismatch)[] scores, double gap, double mismatch) =>
        1 + Array.FindLastIndex(scores, score => Math.Abs(score.Gap) >= gap || score.Mismatch >= mismatch) + 1;

    private static void AssertAsks(PlainRun run, JournalEntry.RoundAsked entry, JsonElement asks)
    {
        var z = asks.GetProperty("z_mw");
        var u = asks.GetProperty("u");
        var heard = 0;
        foreach (var (site, ask) in entry.Asks)
        {
            var part = run.Setups.Coordinator.Sites[site];
            if (ask.Consensus.Length == 0)
            {
                // A site that cannot move is asked in round 1 alone.
                Assert.Equal(1, entry.Id.Round);
                Assert.False(z.TryGetProperty(part.Name, out _));
                continue;
            }

            heard++;
            Assert.Equal(z.GetProperty(part.Name).GetDouble(), ask.Consensus[0], ToleranceMw);
            Assert.Equal(u.GetProperty(part.Name).GetDouble(), ask.Dual[0], ToleranceMw * part.Components[0].Penalty);
        }

        Assert.Equal(z.EnumerateObject().Count(), heard);
    }

    private static void AssertAnswers(PlainRun run, JournalEntry.RoundClosed entry, JsonElement answers)
    {
        Assert.Empty(entry.Held);
        Assert.Equal(answers.EnumerateObject().Count(), entry.Answers.Count);
        foreach (var (site, answer) in entry.Answers)
        {
            var name = run.Setups.Coordinator.Sites[site].Name;
            Assert.Equal(answers.GetProperty(name).GetDouble(), Math.ScaleB((double)Assert.Single(answer.Steps), -30), ToleranceMw);
        }
    }

    private static void AssertConsensus(PlainRun run, CoordinatorState state, JsonElement z)
    {
        var sites = run.Setups.Coordinator.Sites;
        for (var s = 0; s < sites.Count; s++)
            Assert.Equal(z.GetProperty(sites[s].Name).GetDouble(), state.Consensus[s], ToleranceMw);
    }
}
