namespace Halfvoice.Optimization;

/// <summary>Takes a scaled point back to MW and $/MWh and measures there how good it is.</summary>
internal static class SolutionReader
{
    private const double ConvergedGap = 1e-8;
    private const double ConvergedMw = 1e-6;

    public static NetworkSolution Read(
        ScaledProgram program, ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw, Iterate point, int iterations)
    {
        var graph = program.Graph;
        var amount = Amounts(program, blocks, point);
        var price = Array.ConvertAll(point.Price, x => x * program.Price);
        var angle = Angles(program, point);
        var flow = new double[graph.LineCount];
        for (var l = 0; l < flow.Length; l++)
            flow[l] = graph.SusceptanceMwPerRad[l] * (angle[graph.From[l]] - angle[graph.To[l]]);
        var line = new double[graph.LineCount];
        for (var j = program.FreeCount; j < program.Count; j++)
            line[program.LineOfItem[j - program.FreeCount]] = (point.AboveDual[j] - point.BelowDual[j]) * program.Price;
        double cost = 0;
        for (var k = 0; k < amount.Length; k++)
            cost += blocks[k].CostPerHour(amount[k]);
        var imbalance = Imbalance(graph, blocks, demandMw, amount, flow);
        var overload = 0.0;
        for (var l = 0; l < flow.Length; l++)
            overload = Math.Max(overload, Math.Abs(flow[l]) - graph.LimitMw[l]);
        var dual = DualResidual(graph, price, line);
        var gap = (cost - LowerBound(graph, blocks, demandMw, amount, price, line)) / (1 + Math.Abs(cost));
        var room = ConvergedMw * Math.Max(1, program.PowerMw / 100);
        return new NetworkSolution
        {
            Converged = imbalance <= room && overload <= room && Math.Abs(gap) <= ConvergedGap
                && dual <= ConvergedGap * 100 * program.Price,
            CostPerHour = cost,
            BlockMw = amount,
            PricePerMwh = price,
            FlowMw = flow,
            LinePricePerMwh = Array.ConvertAll(line, Math.Abs),
            AngleRad = angle,
            Iterations = iterations,
            MaxImbalanceMw = imbalance,
            MaxOverloadMw = overload,
            DualResidualPerMwh = dual,
            RelativeGap = gap,
        };
    }

    private static double[] Amounts(ScaledProgram program, ReadOnlySpan<Block> blocks, Iterate point)
    {
        var amount = new double[blocks.Length];
        for (var k = 0; k < amount.Length; k++)
            amount[k] = Math.Clamp(program.FixedAmount[k] * program.PowerMw, blocks[k].LowerMw, blocks[k].UpperMw);
        for (var j = 0; j < program.FreeCount; j++)
        {
            var k = program.FreeBlock[j];
            amount[k] = Math.Clamp(point.Value[j] * program.PowerMw, blocks[k].LowerMw, blocks[k].UpperMw);
        }

        return amount;
    }

    private static double[] Angles(ScaledProgram program, Iterate point)
    {
        var graph = program.Graph;
        var angle = new double[graph.BusCount];
        for (var i = 0; i < angle.Length; i++)
            angle[i] = (point.Angle[i] - point.Angle[graph.ReferenceBus[graph.IslandOf[i]]]) * program.AngleRad;
        return angle;
    }

    private static double Imbalance(
        GridGraph graph, ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw, double[] amount, double[] flow)
    {
        var rest = new double[graph.BusCount];
        for (var i = 0; i < rest.Length; i++)
            rest[i] = -demandMw[i];
        for (var k = 0; k < amount.Length; k++)
            rest[blocks[k].Bus] += amount[k];
        for (var l = 0; l < flow.Length; l++)
        {
            rest[graph.From[l]] -= flow[l];
            rest[graph.To[l]] += flow[l];
        }

        double largest = 0;
        foreach (var value in rest)
            largest = double.IsNaN(value) ? double.PositiveInfinity : Math.Max(largest, Math.Abs(value));
        return largest;
    }

    private static double DualResidual(GridGraph graph, double[] price, double[] line)
    {
        var rest = new double[graph.BusCount];
        var size = new double[graph.BusCount];
        for (var l = 0; l < line.Length; l++)
        {
            var b = graph.SusceptanceMwPerRad[l];
            var pull = b * (price[graph.From[l]] - price[graph.To[l]] + line[l]);
            rest[graph.From[l]] += pull;
            rest[graph.To[l]] -= pull;
            size[graph.From[l]] += Math.Abs(b);
            size[graph.To[l]] += Math.Abs(b);
        }

        double largest = 0;
        for (var i = 0; i < rest.Length; i++)
        {
            if (size[i] > 0)
                largest = Math.Max(largest, Math.Abs(rest[i]) / size[i]);
        }

        return largest;
    }

    /// <summary>
    /// Lagrangian bound: whatever the prices, as long as they satisfy the angle condition, no feasible point costs less than
    /// Σ λ d − Σ limit·|y| + Σ min over its limits of (cost of a block − λ s). A block without a limit on the side to which
    /// its price would drive it counts where it stands; its share of the gap is then its reduced cost times its amount.
    /// </summary>
    private static double LowerBound(
        GridGraph graph, ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw, double[] amount, double[] price, double[] line)
    {
        double bound = 0;
        for (var i = 0; i < price.Length; i++)
            bound += price[i] * demandMw[i];
        for (var l = 0; l < line.Length; l++)
        {
            if (line[l] != 0)
                bound -= graph.LimitMw[l] * Math.Abs(line[l]);
        }

        for (var k = 0; k < blocks.Length; k++)
        {
            var block = blocks[k];
            var reduced = block.PricePerMwh - price[block.Bus];
            var best = block.SlopePerMw2h > 0 ? -reduced / block.SlopePerMw2h
                : reduced > 0 ? block.LowerMw : reduced < 0 ? block.UpperMw : amount[k];
            best = Math.Clamp(best, block.LowerMw, block.UpperMw);
            if (!double.IsFinite(best))
                best = amount[k];
            bound += (reduced + (0.5 * block.SlopePerMw2h * best)) * best;
        }

        return bound;
    }
}
