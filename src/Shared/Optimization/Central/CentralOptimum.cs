using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>
/// Central DC optimal power flow, the yardstick of every rehearsal: min Σ a·p² + b·p + c subject to balance at every bus,
/// |flow| ≤ limit and min ≤ p ≤ max, with flow = base_mva · (θ_from − θ_to) / reactance_pu.
/// </summary>
/// <remarks>
/// An answer is called infeasible only after the elastic problem, which always has a solution, has found unserved power. Where the
/// direct attempt fails although nothing need be unserved (problems without an interior), a penalty on unserved power finds the optimum.
/// </remarks>
public static class CentralOptimum
{
    private const int MaxPenalties = 4;

    /// <summary>Optimum of a network for loads in MW by bus.</summary>
    /// <exception cref="ArgumentException">The loads do not fit the network, or a value is out of range.</exception>
    public static Optimum Solve(Network network, ReadOnlySpan<double> loadMw, OptimumOptions? options = null) =>
        Solve(network, new NetworkProgram(network), loadMw, options);

    /// <summary>As above, with the analysis of the grid done before; for many loads on one network.</summary>
    /// <param name="program">Made from the same network.</param>
    public static Optimum Solve(
        Network network, NetworkProgram program, ReadOnlySpan<double> loadMw, OptimumOptions? options = null)
    {
        options ??= new OptimumOptions();
        var blocks = Blocks(network);
        var iterations = 0;
        var balance = new IslandBalance(program.Graph, blocks, loadMw);
        var tolerance = options.UnservedTolerance * Math.Max(1, balance.TotalLoadMw);
        if (balance.WorstMw <= tolerance)
        {
            var direct = program.Solve(blocks, loadMw, options);
            if (direct.Converged)
                return Found(network, direct, direct.Iterations);
            iterations = direct.Iterations;
        }

        var least = LeastUnserved.Solve(program, blocks, loadMw, options);
        iterations += least.Solution.Iterations;
        if (least.UnservedMw > tolerance && least.Solution.Converged)
            return NotServed(network, least, balance, iterations);
        return Penalised(network, program, blocks, loadMw, options, tolerance, iterations);
    }

    private static Block[] Blocks(Network network)
    {
        var blocks = new Block[network.Generators.Count];
        for (var g = 0; g < blocks.Length; g++)
        {
            var plant = network.Generators[g];
            if (!double.IsFinite(plant.MinMw) || !double.IsFinite(plant.MaxMw))
                throw new ArgumentException($"Generator {plant.Name} needs finite limits.", nameof(network));
            blocks[g] = new Block(plant.Bus, plant.MinMw, plant.MaxMw, plant.CostLinear, 2 * plant.CostQuadratic);
        }

        return blocks;
    }

    private static Optimum Penalised(
        Network network,
        NetworkProgram program,
        Block[] blocks,
        ReadOnlySpan<double> loadMw,
        OptimumOptions options,
        double tolerance,
        int iterations)
    {
        var price = 1.0;
        foreach (var block in blocks)
            price = Math.Max(price, Math.Max(Math.Abs(block.MarginalCost(block.LowerMw)), Math.Abs(block.MarginalCost(block.UpperMw))));
        NetworkSolution? last = null;
        for (var attempt = 0; attempt < MaxPenalties; attempt++)
        {
            price *= 20;
            last = program.SolveElastic(blocks, loadMw, price, options);
            iterations += last.Iterations;
            if (last.Converged && last.ShedMw.Sum() + last.SpillMw.Sum() <= tolerance)
                return Found(network, last, iterations);
        }

        return Found(network, last!, iterations) with { Status = OptimumStatus.NotConverged };
    }

    private static Optimum Found(Network network, NetworkSolution solution, int iterations)
    {
        double cost = 0;
        for (var g = 0; g < solution.BlockMw.Length; g++)
            cost += network.Generators[g].CostPerHour(solution.BlockMw[g]);
        return new Optimum
        {
            Status = OptimumStatus.Optimal,
            CostPerHour = cost,
            DispatchMw = solution.BlockMw,
            PricePerMwh = solution.PricePerMwh,
            FlowMw = solution.FlowMw,
            LinePricePerMwh = solution.LinePricePerMwh,
            AngleRad = solution.AngleRad,
            Iterations = iterations,
            MaxImbalanceMw = solution.MaxImbalanceMw,
            MaxOverloadMw = solution.MaxOverloadMw,
            DualResidualPerMwh = solution.DualResidualPerMwh,
            RelativeGap = solution.RelativeGap,
        };
    }

    private static Optimum NotServed(Network network, LeastUnserved least, IslandBalance balance, int iterations) =>
        Found(network, least.Solution, iterations) with
        {
            Status = OptimumStatus.Infeasible,
            CostPerHour = double.NaN,
            PricePerMwh = new double[network.Buses.Count],
            LinePricePerMwh = new double[network.Lines.Count],
            Infeasibility = least.Explain(balance),
        };
}
