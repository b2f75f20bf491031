using System.Diagnostics;
using System.Globalization;
using Google.OrTools.LinearSolver;
using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Benchmarks;

/// <summary>
/// Central optimum against a general-purpose simplex method (GLOP) on linear costs, and the projection of a coordination
/// round when warm. Every ratio is of two medians measured in the same run.
/// </summary>
public static class OptimumBenchmark
{
    /// <summary>Runs everything and prints one line a network; with the argument "quick" the largest networks are left out.</summary>
    public static int Run(string[] args)
    {
        var quick = args.Contains("quick");
        Console.WriteLine(
            "network, buses, lines, plants | optimum ms (iterations) | GLOP ms | GLOP/optimum | cost difference | "
            + "projection us (lines at limit)");
        foreach (var (name, network, load) in Cases(quick))
            Measure(name, network, load);
        return 0;
    }

    private static IEnumerable<(string Name, Network Network, double[] LoadMw)> Cases(bool quick)
    {
        if (OptimumBenchmarkCases.TryRead("ieee-118", out var network, out var load))
            yield return ("ieee-118", network, load);
        foreach (var count in quick ? (int[])[118, 1000] : [118, 1000, 5000, 10000])
        {
            (network, load) = OptimumBenchmarkCases.Generate(count, seed: count);
            yield return ("generated", network, load);
        }
    }

    private static void Measure(string name, Network network, double[] load)
    {
        var repeats = Math.Clamp(20000 / network.Buses.Count, 3, 41);
        var optimum = CentralOptimum.Solve(network, load);
        if (optimum.Status != OptimumStatus.Optimal)
            throw new InvalidOperationException($"{name}: {optimum.Status}. {optimum.Infeasibility?.Describe(network)}");
        var own = Median(repeats, () => CentralOptimum.Solve(network, load));
        var (cost, simplex) = Simplex(network, load, Math.Min(repeats, network.Buses.Count > 2000 ? 1 : 11));
        var (projection, active) = Projection(network, load, optimum);
        Console.WriteLine(string.Create(
            CultureInfo.InvariantCulture,
            $"{name,-9} {network.Buses.Count,6} {network.Lines.Count,6} {network.Generators.Count,5} | {own,9:F2} ({optimum.Iterations}) | "
            + $"{simplex,9:F2} | {simplex / own,7:F2} | {(optimum.CostPerHour - cost) / cost,9:E1} | {1000 * projection,8:F1} ({active})"));
    }

    private static double Median(int repeats, Action action)
    {
        for (var warm = 0; warm < 10 * repeats; warm++)
            action();
        var times = new double[repeats];
        for (var k = 0; k < repeats; k++)
        {
            var start = Stopwatch.GetTimestamp();
            action();
            times[k] = Stopwatch.GetElapsedTime(start).TotalMilliseconds;
        }

        Array.Sort(times);
        return times[repeats / 2];
    }

    /// <summary>Time of the solve call alone; building the model is not counted against the other side.</summary>
    private static (double CostPerHour, double MedianMs) Simplex(Network network, double[] load, int repeats)
    {
        var times = new double[repeats];
        double cost = 0;
        for (var k = 0; k < repeats; k++)
        {
            using var solver = BuildSimplex(network, load);
            var start = Stopwatch.GetTimestamp();
            var status = solver.Solve();
            times[k] = Stopwatch.GetElapsedTime(start).TotalMilliseconds;
            if (status != Solver.ResultStatus.OPTIMAL)
                throw new InvalidOperationException($"The simplex method ended with {status}.");
            cost = solver.Objective().Value() + network.Generators.Sum(plant => plant.CostFixed);
        }

        Array.Sort(times);
        return (cost, times[repeats / 2]);
    }

    private static Solver BuildSimplex(Network network, double[] load)
    {
        var solver = Solver.CreateSolver("GLOP");
        var balance = Array.ConvertAll(load, mw => solver.MakeConstraint(mw, mw));
        foreach (var plant in network.Generators)
        {
            var output = solver.MakeNumVar(plant.MinMw, plant.MaxMw, "");
            balance[plant.Bus].SetCoefficient(output, 1);
            solver.Objective().SetCoefficient(output, plant.CostLinear);
        }

        var angle = Array.ConvertAll(load, _ => solver.MakeNumVar(double.NegativeInfinity, double.PositiveInfinity, ""));
        for (var l = 0; l < network.Lines.Count; l++)
        {
            var line = network.Lines[l];
            var flow = solver.MakeNumVar(-line.LimitMw, line.LimitMw, "");
            var law = solver.MakeConstraint(0, 0);
            law.SetCoefficient(flow, -1);
            law.SetCoefficient(angle[line.FromBus], 1 / line.ReactancePu);
            law.SetCoefficient(angle[line.ToBus], -1 / line.ReactancePu);
            balance[line.FromBus].SetCoefficient(flow, -1);
            balance[line.ToBus].SetCoefficient(flow, 1);
        }

        solver.Objective().SetMinimization();
        return solver;
    }

    /// <summary>
    /// Wishes as a coordinator sees them near the end, x + u/ρ with x at the optimum and −u its prices, and at every plant a fresh
    /// disturbance of up to 2 % of its range each round.
    /// </summary>
    private static (double MedianMs, int Active) Projection(Network network, double[] load, Optimum optimum)
    {
        var buses = load.Length;
        var random = new Random(7);
        var range = new double[buses];
        var wish = Array.ConvertAll(load, mw => -mw);
        for (var g = 0; g < network.Generators.Count; g++)
        {
            range[network.Generators[g].Bus] += network.Generators[g].RangeMw;
            wish[network.Generators[g].Bus] += optimum.DispatchMw[g];
        }

        var free = Array.ConvertAll(range, mw => mw > 0);
        var penalty = Array.ConvertAll(range, mw => mw > 0 ? 50 / mw : 1);
        var projection = new NetworkProjection(network, penalty, free, 50);
        var asked = new double[buses];
        var result = new double[buses];
        var calls = buses > 2000 ? 60 : 2000;
        var times = new double[calls];
        long active = 0;
        for (var call = -calls; call < calls; call++)
        {
            for (var i = 0; i < buses; i++)
            {
                var moved = (0.04 * range[i] * (random.NextDouble() - 0.5)) - (optimum.PricePerMwh[i] / penalty[i]);
                asked[i] = wish[i] + (free[i] ? moved : 0);
            }

            var start = Stopwatch.GetTimestamp();
            var outcome = projection.Project(asked, result);
            if (call >= 0)
                times[call] = Stopwatch.GetElapsedTime(start).TotalMilliseconds;
            active += call >= 0 ? outcome.ActiveLines : 0;
            if (outcome.Relaxed)
                throw new InvalidOperationException("A projection that should exist was relaxed.");
        }

        Array.Sort(times);
        return (times[calls / 2], (int)(active / calls));
    }
}
