using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Tests.Optimization;

public class CentralEdgeCaseTests
{
    private static Network Grid(int buses, Line[] lines, params Generator[] plants) =>
        new(100, Enumerable.Range(0, buses).Select(i => new Bus($"Bus {i}", $"Site {i}")).ToArray(), lines, plants);

    [Fact]
    public void A_single_bus_is_dispatched_in_merit_order()
    {
        var network = Grid(1, [], new Generator("Cheap", 0, 0, 60, 0, 10), new Generator("Dear", 0, 0, 60, 0, 20, 5));
        var optimum = CentralOptimum.Solve(network, [80]);
        CentralCertificate.Holds(network, [80], optimum);
        Assert.Equal(60, optimum.DispatchMw[0], 1e-9);
        Assert.Equal(20, optimum.DispatchMw[1], 1e-9);
        Assert.Equal(20, optimum.PricePerMwh[0], 1e-9);
        Assert.Equal(1005, optimum.CostPerHour, 1e-7);
    }

    [Fact]
    public void Load_equal_to_all_capacity_is_feasible()
    {
        var network = Grid(
            3, [new Line("a", 0, 1, 0.1, 50), new Line("b", 1, 2, 0.2, 50), new Line("c", 0, 2, 0.1)],
            new Generator("G0", 0, 10, 40, 0, 10), new Generator("G1", 1, 0, 30, 0.1, 5), new Generator("G2", 2, 20, 20, 0, 1));
        double[] load = [20, 30, 40];
        var optimum = CentralOptimum.Solve(network, load);
        Assert.Equal(OptimumStatus.Optimal, optimum.Status);
        Assert.Equal(40, optimum.DispatchMw[0], 1e-5);
        Assert.Equal(30, optimum.DispatchMw[1], 1e-5);
        Assert.Equal(20, optimum.DispatchMw[2]);
        Assert.True(optimum.MaxImbalanceMw <= 1e-5);
    }

    [Fact]
    public void Lines_loaded_to_their_limit_by_fixed_plants_alone_are_feasible()
    {
        var network = Grid(
            3, [new Line("a", 0, 1, 0.1, 50), new Line("b", 1, 2, 0.1, 20)],
            new Generator("Fixed", 0, 50, 50, 0, 10), new Generator("Free", 2, -5, 100, 0.01, 30));
        double[] load = [0, 30, 45];
        var optimum = CentralOptimum.Solve(network, load);
        Assert.Equal(OptimumStatus.Optimal, optimum.Status);
        Assert.Equal(25, optimum.DispatchMw[1], 1e-5);
        Assert.Equal(50, optimum.FlowMw[0], 1e-5);
        Assert.Equal(20, optimum.FlowMw[1], 1e-5);
    }

    [Fact]
    public void A_line_at_zero_separates_prices()
    {
        var network = Grid(
            2, [new Line("shut", 0, 1, 0.1, 0)], new Generator("Cheap", 0, 0, 100, 0, 10), new Generator("Dear", 1, 0, 100, 0, 30));
        double[] load = [40, 50];
        var optimum = CentralOptimum.Solve(network, load);
        Assert.Equal(OptimumStatus.Optimal, optimum.Status);
        Assert.Equal(40, optimum.DispatchMw[0], 1e-6);
        Assert.Equal(50, optimum.DispatchMw[1], 1e-6);
        Assert.Equal(10, optimum.PricePerMwh[0], 1e-6);
        Assert.Equal(30, optimum.PricePerMwh[1], 1e-6);
        Assert.Equal(20, optimum.LinePricePerMwh[0], 1e-6);
    }

    [Fact]
    public void A_series_capacitor_that_cancels_its_line_is_solved()
    {
        // Bus 1 sees +0.1 and −0.1 per unit: its own susceptance is zero, so that no pivot of one bus alone would do.
        var network = Grid(
            4,
            [new Line("a", 0, 1, 0.1), new Line("capacitor", 1, 2, -0.1), new Line("b", 2, 3, 0.05, 30), new Line("c", 0, 3, 0.3)],
            new Generator("Cheap", 0, 0, 100, 0, 10), new Generator("Dear", 3, 0, 100, 0.02, 30));
        double[] load = [0, 10, 20, 60];
        var optimum = CentralOptimum.Solve(network, load);
        CentralCertificate.Holds(network, load, optimum);
        var reference = CentralLinearProgram.LeastUnservedMw(network, load);
        Assert.Equal(0, reference, 1e-6);
    }

    [Fact]
    public void Equal_costs_everywhere_still_give_one_exact_optimum_cost()
    {
        var network = Grid(
            4, [new Line("a", 0, 1, 0.1, 15), new Line("b", 1, 2, 0.1, 15), new Line("c", 2, 3, 0.1, 15), new Line("d", 3, 0, 0.1, 15)],
            Enumerable.Range(0, 4).Select(i => new Generator($"G{i}", i, 0, 30, 0, 20)).ToArray());
        double[] load = [35, 10, 5, 20];
        var optimum = CentralOptimum.Solve(network, load);
        CentralCertificate.Holds(network, load, optimum);
        Assert.Equal(1400, optimum.CostPerHour, 1e-5);
    }

    [Fact]
    public void Nothing_to_serve_and_nothing_to_serve_it_with_costs_nothing()
    {
        var network = Grid(2, [new Line("a", 0, 1, 0.1, 10)]);
        var optimum = CentralOptimum.Solve(network, [0, 0]);
        Assert.Equal(OptimumStatus.Optimal, optimum.Status);
        Assert.Equal(0, optimum.CostPerHour);
    }

    [Fact]
    public void An_island_with_balanced_loads_and_no_plant_is_served()
    {
        var network = Grid(
            4, [new Line("a", 0, 1, 0.1, 10), new Line("b", 2, 3, 0.1, 100)], new Generator("G", 2, 0, 100, 0.1, 10));
        double[] load = [-8, 8, 10, 20];
        var optimum = CentralOptimum.Solve(network, load);
        Assert.Equal(OptimumStatus.Optimal, optimum.Status);
        Assert.Equal(8, optimum.FlowMw[0], 1e-7);
        Assert.Equal(30, optimum.DispatchMw[0], 1e-7);
    }

    [Fact]
    public void A_pocket_behind_a_full_line_is_explained_by_bus_and_line()
    {
        var network = Grid(
            3, [new Line("Neck", 0, 1, 0.1, 40), new Line("Inner", 1, 2, 0.1)], new Generator("Big", 0, 0, 500, 0, 10));
        double[] load = [10, 30, 22.5];
        var optimum = CentralOptimum.Solve(network, load);
        Assert.Equal(OptimumStatus.Infeasible, optimum.Status);
        var why = optimum.Infeasibility!;
        Assert.Equal(12.5, why.UnservedMw, 1e-4);
        Assert.Equal([0], why.LimitingLines);
        Assert.Empty(why.Spilled);
        Assert.Equal(12.5, why.Shed.Sum(at => at.Mw), 1e-4);
        Assert.All(why.Shed, at => Assert.True(at.Bus is 1 or 2));
        Assert.Equal(0, why.CapacityShortMw);
        var text = why.Describe(network);
        Assert.StartsWith("12.5 MW of load cannot be served: ", text);
        Assert.EndsWith("Lines at their limit that hold it back: Neck (40.0 MW).", text);
    }

    [Fact]
    public void Load_beyond_all_capacity_is_said_to_be_that()
    {
        var network = Grid(2, [new Line("a", 0, 1, 0.1)], new Generator("G", 0, 0, 50, 0, 10));
        var optimum = CentralOptimum.Solve(network, [0, 57.2]);
        Assert.Equal(OptimumStatus.Infeasible, optimum.Status);
        Assert.Equal(7.2, optimum.Infeasibility!.UnservedMw, 1e-5);
        Assert.Equal(7.2, optimum.Infeasibility.CapacityShortMw, 1e-9);
        Assert.Empty(optimum.Infeasibility.LimitingLines);
        Assert.Equal(
            "7.2 MW of load cannot be served: 7.2 MW at Bus 1. Load exceeds what the generators that it is connected to can give "
            + "at most by 7.2 MW.",
            optimum.Infeasibility.Describe(network));
    }

    [Fact]
    public void Minimum_generation_above_load_is_said_to_be_that()
    {
        var network = Grid(2, [new Line("a", 0, 1, 0.1)], new Generator("Must run", 0, 40, 50, 0, 10));
        var optimum = CentralOptimum.Solve(network, [0, 30]);
        Assert.Equal(OptimumStatus.Infeasible, optimum.Status);
        Assert.Equal(10, optimum.Infeasibility!.MinimumExcessMw, 1e-9);
        Assert.Equal(10, optimum.Infeasibility.Spilled.Sum(at => at.Mw), 1e-5);
        Assert.Equal(0, Assert.Single(optimum.Infeasibility.Spilled).Bus);
        Assert.Equal(
            "10.0 MW of generation finds no taker: 10.0 MW at Bus 0. The least that the generators can give exceeds the load that "
            + "they are connected to by 10.0 MW.",
            optimum.Infeasibility.Describe(network));
    }

    [Theory]
    [InlineData(1e-9)]
    [InlineData(-1e-9)]
    public void Rounding_in_a_load_is_no_reason_to_call_a_plan_infeasible(double roundingMw)
    {
        var network = Grid(2, [new Line("a", 0, 1, 0.1, 50)], new Generator("G", 0, 0, 50, 0, 10));
        var optimum = CentralOptimum.Solve(network, [0, 50 + roundingMw]);
        Assert.Equal(OptimumStatus.Optimal, optimum.Status);
        Assert.Equal(50, optimum.DispatchMw[0], 1e-6);
    }

    [Fact]
    public void Prices_are_the_cost_of_one_more_megawatt_of_load()
    {
        // Central difference on a quadratic network: away from a change of the binding limits it is exact.
        var checkedBuses = 0;
        for (var seed = 300; seed < 320; seed++)
        {
            var (network, load) = CentralNetworks.Random(new Random(seed), quadratic: true);
            var optimum = CentralOptimum.Solve(network, load);
            if (optimum.Status != OptimumStatus.Optimal)
                continue;
            for (var bus = 0; bus < load.Length; bus++)
            {
                double[] less = [.. load], more = [.. load];
                less[bus] -= 1e-3;
                more[bus] += 1e-3;
                var low = CentralOptimum.Solve(network, less);
                var high = CentralOptimum.Solve(network, more);
                if (low.Status != OptimumStatus.Optimal || high.Status != OptimumStatus.Optimal)
                    continue;
                if (Math.Abs(high.PricePerMwh[bus] - low.PricePerMwh[bus]) > 0.01)
                    continue;
                Assert.Equal((high.CostPerHour - low.CostPerHour) / 2e-3, optimum.PricePerMwh[bus], 0.01);
                checkedBuses++;
            }
        }

        Assert.True(checkedBuses >= 50, $"only {checkedBuses} buses could be checked");
    }

    [Fact]
    public void Wrong_input_is_refused_by_name()
    {
        var network = Grid(2, [new Line("a", 0, 1, 0.1, 50)], new Generator("G", 0, 0, 50, 0, 10));
        Assert.Throws<ArgumentException>(() => CentralOptimum.Solve(network, [1]));
        Assert.Throws<ArgumentException>(() => CentralOptimum.Solve(network, [1, double.NaN]));
        Assert.Throws<ArgumentOutOfRangeException>(
            () => CentralOptimum.Solve(network, [1, 1], new OptimumOptions { MaxIterations = 0 }));
        var open = Grid(1, [], new Generator("Endless", 0, 0, double.PositiveInfinity, 0, 10));
        Assert.Contains("Endless", Assert.Throws<ArgumentException>(() => CentralOptimum.Solve(open, [1])).Message);
        var shorted = Grid(2, [new Line("short", 0, 1, 0)]);
        Assert.Contains("short", Assert.Throws<ArgumentException>(() => CentralOptimum.Solve(shorted, [0, 0])).Message);
        var program = new NetworkProgram(network);
        Assert.Throws<ArgumentException>(() => program.Solve([new Block(5, 0, 1, 0, 0)], [0, 0]));
        Assert.Throws<ArgumentException>(() => program.Solve([new Block(0, 2, 1, 0, 0)], [0, 0]));
        Assert.Throws<ArgumentException>(
            () => program.Solve([new Block(0, double.NegativeInfinity, double.PositiveInfinity, 1, 0)], [0, 0]));
    }
}
