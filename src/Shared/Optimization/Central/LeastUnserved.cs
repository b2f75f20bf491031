namespace Halfvoice.Optimization;

/// <summary>
/// The elastic problem behind an infeasibility: the least total of load left out and power thrown away, costs aside.
/// Among equal totals it leaves out load where there is load, and throws away power where there is power, by a price difference that
/// is too small to show in the total.
/// </summary>
internal sealed class LeastUnserved
{
    private const double Elsewhere = 1 + 1e-6;
    private const double HelpfulLine = 1e-4;

    private readonly NetworkProgram _program;
    private readonly double[] _shedMw;
    private readonly double[] _spillMw;

    private LeastUnserved(NetworkProgram program, NetworkSolution solution, double[] shedMw, double[] spillMw)
    {
        _program = program;
        Solution = solution;
        _shedMw = shedMw;
        _spillMw = spillMw;
        for (var i = 0; i < shedMw.Length; i++)
        {
            // What is left out and thrown away at the same bus would cancel; an optimum never has both.
            UnservedMw += shedMw[i] + spillMw[i];
        }
    }

    /// <summary>Solution of the elastic problem; its blocks are those that were asked about.</summary>
    public NetworkSolution Solution { get; }

    /// <summary>The least total, MW.</summary>
    public double UnservedMw { get; }

    public static LeastUnserved Solve(
        NetworkProgram program, ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw, OptimumOptions options)
    {
        var free = new Block[blocks.Length];
        for (var k = 0; k < free.Length; k++)
            free[k] = blocks[k] with { PricePerMwh = 0, SlopePerMw2h = 0 };
        var placed = SolvePlaced(program, free, demandMw, options);
        if (placed.Solution.Converged)
            return placed;

        // The small price difference makes the problem harder; without it only the total is certain, and that matters more.
        var plain = program.SolveElastic(free, demandMw, 1, options);
        return plain.Converged ? new LeastUnserved(program, plain, plain.ShedMw, plain.SpillMw) : placed;
    }

    private static LeastUnserved SolvePlaced(
        NetworkProgram program, Block[] free, ReadOnlySpan<double> demandMw, OptimumOptions options)
    {
        var buses = program.Graph.BusCount;
        var sources = new double[buses];
        var all = new List<Block>(free.Length + (4 * buses));
        all.AddRange(free);
        foreach (var block in free)
            sources[block.Bus] += Math.Max(0, block.UpperMw);

        for (var i = 0; i < buses; i++)
        {
            var load = Math.Max(0, demandMw[i]);
            var source = sources[i] + Math.Max(0, -demandMw[i]);
            all.Add(new Block(i, 0, load, 1, 0));
            all.Add(new Block(i, 0, double.PositiveInfinity, Elsewhere, 0));
            all.Add(new Block(i, -source, 0, -1, 0));
            all.Add(new Block(i, double.NegativeInfinity, 0, -Elsewhere, 0));
        }

        var solution = program.Solve([.. all], demandMw, options);
        var shed = new double[buses];
        var spill = new double[buses];
        for (var i = 0; i < buses; i++)
        {
            var first = free.Length + (4 * i);
            shed[i] = solution.BlockMw[first] + solution.BlockMw[first + 1];
            spill[i] = -solution.BlockMw[first + 2] - solution.BlockMw[first + 3];
        }

        return new LeastUnserved(program, solution with { BlockMw = solution.BlockMw[..free.Length] }, shed, spill);
    }

    public Infeasibility Explain(IslandBalance balance)
    {
        var line = Solution.LinePricePerMwh;
        var limiting = Enumerable.Range(0, line.Length)
            .Where(l => line[l] > HelpfulLine && !double.IsPositiveInfinity(_program.Graph.LimitMw[l]))
            .OrderByDescending(l => line[l]).ToArray();
        return new Infeasibility
        {
            UnservedMw = UnservedMw,
            Shed = Listed(_shedMw),
            Spilled = Listed(_spillMw),
            LimitingLines = limiting,
            CapacityShortMw = balance.CapacityShortMw,
            MinimumExcessMw = balance.MinimumExcessMw,
        };
    }

    private UnservedAt[] Listed(double[] amountMw)
    {
        var least = 1e-6 * UnservedMw;
        return amountMw.Select((mw, bus) => new UnservedAt(bus, mw)).Where(at => at.Mw > least)
            .OrderByDescending(at => at.Mw).ThenBy(at => at.Bus).ToArray();
    }
}
