using Halfvoice.Coordination;
using Halfvoice.Grid;
using Halfvoice.Optimization;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>What a dispatch is worth once plants run it against the true loads.</summary>
public class DeliveredDispatchTests
{
    /// <summary>
    /// The reference announces loads with noise, schedules clip(z + announced), and balances against the true ones. Cost is compared to
    /// 1e-6 of the optimum: 54 plants at 4e-5 MW and some 40 $/MWh.
    /// </summary>
    [Fact]
    public void Balancing_by_headroom_costs_and_loads_lines_as_in_the_reference()
    {
        using var trace = ReferenceTrace.Injection("ieee-118", 40, noiseMw: 2);
        var cycle = trace.RootElement.GetProperty("cycles")[0];
        var rounds = cycle.GetProperty("rounds");
        var truth = ReferenceTrace.Plan("ieee-118");
        var announced = cycle.GetProperty("announced_mw");
        var plan = truth with
        {
            Stop = new StopSettings { ReferenceLoadMw = announced.EnumerateObject().Sum(site => site.Value.GetDouble()), RoundCap = 40 },
            Loads = truth.Network.Sites.ToDictionary(site => site, site => new LoadSeries([], [[announced.GetProperty(site).GetDouble()]])),
        };
        var run = PlainRun.Of(plan);
        var load = truth.LoadMw(1);
        var optimum = CentralOptimum.Solve(truth.Network, load).CostPerHour;
        var balanced = 0;
        foreach (var (setPoints, round) in Schedules(run).Zip(rounds.EnumerateArray()))
        {
            var expected = round.GetProperty("measures");
            var score = DeliveredDispatch.Score(truth.Network, load, setPoints, optimum);
            Assert.Equal(expected.GetProperty("balanced_cost_gap").GetDouble() / 100, (score.CostPerHour / optimum) - 1, 1e-6);
            Assert.Equal(expected.GetProperty("worst_line_loading").GetDouble() / 100, score.WorstLoading, 1e-5);
            Assert.Equal(Math.Abs(expected.GetProperty("imbalance_mw").GetDouble()), score.ReserveMw + score.UnbalancedMw, 54 * 4e-5);
            if (score.UnbalancedMw == 0)
                balanced++;
            if (score.Overloads.Count == 0 && score.UnbalancedMw == 0)
                Assert.Equal(Math.Max(0, (score.CostPerHour / optimum) - 1), score.CostGap, 1e-9);
        }

        Assert.True(balanced > 10, "Too few rounds had the headroom to be balanced.");
    }

    [Fact]
    public void Shares_go_by_headroom_in_the_direction_needed()
    {
        var network = Pair(double.PositiveInfinity);
        var shortfall = DeliveredDispatch.Score(network, [0, 90], [40, 20], 1000);
        Assert.Equal([40 + (30 * 60 / 140.0), 20 + (30 * 80 / 140.0)], shortfall.OutputMw.Select(mw => Math.Round(mw, 9)), (a, b) => Math.Abs(a - b) < 1e-9);
        Assert.Equal(30, shortfall.ReserveMw, 1e-9);
        var surplus = DeliveredDispatch.Score(network, [0, 30], [40, 20], 1000);
        Assert.Equal([20, 10], surplus.OutputMw, (a, b) => Math.Abs(a - b) < 1e-9);
        Assert.Equal(30, surplus.ReserveMw, 1e-9);
        Assert.Equal(0, surplus.UnbalancedMw, 1e-9);
    }

    [Fact]
    public void What_no_headroom_is_left_for_stays_unbalanced()
    {
        var score = DeliveredDispatch.Score(Pair(double.PositiveInfinity), [0, 230], [95, 90], 5000);
        Assert.Equal([100, 100], score.OutputMw, (a, b) => Math.Abs(a - b) < 1e-9);
        Assert.Equal(15, score.ReserveMw, 1e-9);
        Assert.Equal(30, score.UnbalancedMw, 1e-9);
        var full = DeliveredDispatch.Score(Pair(double.PositiveInfinity), [0, 230], [100, 100], 5000);
        Assert.Equal(0, full.ReserveMw);
        Assert.Equal(30, full.UnbalancedMw, 1e-9);
    }

    [Fact]
    public void Every_island_is_balanced_by_its_own_plants()
    {
        var buses = Enumerable.Range(0, 4).Select(b => new Bus($"b{b}", $"s{b}")).ToArray();
        Line[] lines = [new("a", 0, 1, 0.1, 100), new("b", 2, 3, 0.1, 50)];
        Generator[] plants = [new("p", 0, 0, 100, 0, 10), new("q", 2, 0, 40, 0, 20)];
        var score = DeliveredDispatch.Score(new Network(100, buses, lines, plants), [0, 60, 0, 50], [70, 30], 1000);
        Assert.Equal([60, 40], score.OutputMw, (a, b) => Math.Abs(a - b) < 1e-9);
        Assert.Equal(10 + 10, score.ReserveMw, 1e-9);
        Assert.Equal(10, score.UnbalancedMw, 1e-9);
        Assert.Equal(60, score.FlowMw[0], 1e-9);
    }

    [Fact]
    public void Overloads_and_the_worst_line_are_named()
    {
        var score = DeliveredDispatch.Score(Pair(25), [0, 60], [50, 10], 900);
        var over = Assert.Single(score.Overloads);
        Assert.Equal((0, 25.0), (over.Line, over.LimitMw));
        Assert.Equal(50, over.FlowMw, 1e-9);
        Assert.Equal((0, 2.0), (score.WorstLine!.Value, Math.Round(score.WorstLoading, 9)));
        Assert.Null(DeliveredDispatch.Score(Pair(double.PositiveInfinity), [0, 60], [50, 10], 900).WorstLine);
    }

    [Fact]
    public void A_dispatch_that_undercuts_the_optimum_by_overloading_a_line_has_no_negative_gap()
    {
        // 10 $/MWh behind a line of 25 MW, 20 $/MWh at the load: the optimum is 25 · 10 + 35 · 20 = 950 $/h.
        var network = Pair(25);
        double[] load = [0, 60];
        var optimum = CentralOptimum.Solve(network, load).CostPerHour;
        Assert.Equal(950, optimum, 1e-4);
        var score = DeliveredDispatch.Score(network, load, [50, 10], optimum);
        Assert.Equal(700, score.CostPerHour, 1e-9);
        Assert.InRange(score.CostGap, 0, 1e-5);
        Assert.InRange(DeliveredDispatch.Score(network, load, [20, 40], optimum).CostGap, 1000 / 950.0 - 1 - 1e-6, 1000 / 950.0 - 1 + 1e-6);
    }

    [Fact]
    public void No_random_dispatch_has_a_negative_gap()
    {
        int overloaded = 0, cheaper = 0;
        for (var seed = 0; seed < 10; seed++)
        {
            var plan = InventedPlans.Make(14, seed, 1, 1);
            var load = plan.LoadMw(1);
            var optimum = CentralOptimum.Solve(plan.Network, load);
            var random = new Random(seed);
            for (var i = 0; i < 12; i++)
            {
                var setPoints = plan.Network.Generators.Select((g, k) => Math.Clamp(
                    optimum.DispatchMw[k] + (g.RangeMw * (random.NextDouble() - 0.5) * 0.1 * i), g.MinMw, g.MaxMw)).ToArray();
                var score = DeliveredDispatch.Score(plan.Network, load, setPoints, optimum.CostPerHour);
                if (score.UnbalancedMw > 1e-9)
                    continue;
                Assert.True(score.CostGap >= 0, $"Seed {seed}: gap {score.CostGap}.");
                overloaded += score.Overloads.Count > 0 ? 1 : 0;
                cheaper += score.CostPerHour < optimum.CostPerHour * (1 - 1e-5) ? 1 : 0;
            }
        }

        Assert.True(overloaded > 10 && cheaper > 0, $"Only {overloaded} dispatches overload a line and {cheaper} undercut the optimum.");
    }

    [Fact]
    public void Arrays_of_the_wrong_length_are_an_error()
    {
        Assert.Throws<ArgumentException>(() => DeliveredDispatch.Score(Pair(25), [0], [50, 10], 900));
        Assert.Throws<ArgumentException>(() => DeliveredDispatch.Score(Pair(25), [0, 1], [50], 900));
    }

    private static IEnumerable<double[]> Schedules(PlainRun run)
    {
        var network = run.Plan.Network;
        var index = network.Generators.Select((g, i) => (g.Name, i)).ToDictionary(pair => pair.Name, pair => pair.i);
        var setups = network.Sites.Select(run.Setups.ForSite).ToArray();
        var states = run.Journal.OfType<JournalEntry.RoundAsked>().Skip(1).Select(entry => entry.State)
            .Append(run.Journal.OfType<JournalEntry.CycleClosed>().Single().State);
        foreach (var state in states)
        {
            var setPoints = new double[network.Generators.Count];
            for (var s = 0; s < setups.Length; s++)
            {
                var output = new double[setups[s].Generators.Count];
                new InjectionSite(setups[s]).Dispatch(
                    run.Plan.Loads[setups[s].Site].At(1), new Outcome(1, CycleEnd.Settled, 1, [state.Consensus[s]], [state.Dual[s]]), output);
                for (var g = 0; g < output.Length; g++)
                    setPoints[index[setups[s].Generators[g].Name]] = output[g];
            }

            yield return setPoints;
        }
    }

    /// <summary>Two buses, a plant of 0 to 100 MW at each (10 and 20 $/MWh), one line.</summary>
    private static Network Pair(double limitMw) => new(
        100,
        [new Bus("a", "sa"), new Bus("b", "sb")],
        [new Line("ab", 0, 1, 0.1, limitMw)],
        [new Generator("cheap", 0, 0, 100, 0, 10), new Generator("dear", 1, 0, 100, 0, 20)]);
}
