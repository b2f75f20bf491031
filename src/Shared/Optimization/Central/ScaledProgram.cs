namespace Halfvoice.Optimization;

/// <summary>
/// A network problem in scaled units, ready for the interior-point method: power in units of a typical MW amount, money so that the
/// largest marginal cost is about 1, angles so that a typical susceptance is 1. Blocks without width are demand, lines
/// whose limit cannot bind are unlimited. What is left is one list of bounded items v:
/// the free blocks (cost c v + q/2 v², balance at their bus), then the limited lines (v = b(θ_f − θ_t)), then the lines held at zero.
/// </summary>
internal sealed class ScaledProgram
{
    // Narrower than this (in scaled units) an interior point has no room; the midpoint is used instead.
    private const double NoWidth = 1e-10;

    public ScaledProgram(GridGraph graph, ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw)
    {
        Graph = graph;
        BlockCount = blocks.Length;
        PowerMw = TypicalPower(blocks, demandMw);
        Price = TypicalPrice(blocks, PowerMw);
        Susceptance = ScaledSusceptance(out var typical);
        AngleRad = PowerMw / typical;
        Demand = new double[graph.BusCount];
        for (var i = 0; i < Demand.Length; i++)
            Demand[i] = demandMw[i] / PowerMw;
        var free = new List<int>(blocks.Length);
        FixedAmount = new double[blocks.Length];
        for (var k = 0; k < blocks.Length; k++)
        {
            if (blocks[k].UpperMw - blocks[k].LowerMw > NoWidth * PowerMw)
            {
                free.Add(k);
                continue;
            }

            FixedAmount[k] = (blocks[k].LowerMw + blocks[k].UpperMw) / 2 / PowerMw;
            Demand[blocks[k].Bus] -= FixedAmount[k];
        }

        FreeBlock = [.. free];
        var (limited, pinned) = ChooseLines(blocks);
        LineOfItem = [.. limited, .. pinned];
        FreeCount = FreeBlock.Length;
        LimitedEnd = FreeCount + limited.Count;
        Count = LimitedEnd + pinned.Count;
        Lower = new double[Count];
        Upper = new double[Count];
        Cost = new double[Count];
        Slope = new double[Count];
        BusOf = new int[FreeCount];
        FillItems(blocks);
    }

    public GridGraph Graph { get; }

    /// <summary>Number of blocks in the unscaled problem.</summary>
    public int BlockCount { get; }

    /// <summary>MW per unit of power.</summary>
    public double PowerMw { get; }

    /// <summary>$/MWh per unit of price.</summary>
    public double Price { get; }

    /// <summary>Radians per unit of angle.</summary>
    public double AngleRad { get; }

    /// <summary>By line.</summary>
    public double[] Susceptance { get; }

    /// <summary>By bus, less the blocks without width.</summary>
    public double[] Demand { get; }

    /// <summary>Index of the block behind a free item.</summary>
    public int[] FreeBlock { get; }

    /// <summary>By block: its amount where it has no width.</summary>
    public double[] FixedAmount { get; }

    /// <summary>Items before this index are blocks.</summary>
    public int FreeCount { get; }

    /// <summary>Items from <see cref="FreeCount"/> to here are limited lines; from here to the end lines held at zero.</summary>
    public int LimitedEnd { get; }

    /// <summary>Number of items.</summary>
    public int Count { get; }

    /// <summary>Line behind item FreeCount + t.</summary>
    public int[] LineOfItem { get; }

    public double[] Lower { get; }

    public double[] Upper { get; }

    public double[] Cost { get; }

    public double[] Slope { get; }

    /// <summary>Bus of a free block.</summary>
    public int[] BusOf { get; }

    /// <summary>True when no free block has a slope.</summary>
    public bool IsLinear { get; private set; } = true;

    private static double TypicalPower(ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw)
    {
        double sum = 0;
        var count = 0;
        foreach (var block in blocks)
        {
            var width = block.UpperMw - block.LowerMw;
            if (!(width > 0) || !double.IsFinite(width))
                continue;
            sum += width;
            count++;
        }

        foreach (var demand in demandMw)
        {
            if (demand == 0)
                continue;
            sum += Math.Abs(demand);
            count++;
        }

        return count == 0 || sum == 0 ? 1 : sum / count;
    }

    private static double TypicalPrice(ReadOnlySpan<Block> blocks, double powerMw)
    {
        double largest = 0;
        foreach (var block in blocks)
        {
            if (block.UpperMw <= block.LowerMw)
                continue;
            var low = double.IsFinite(block.LowerMw) ? block.LowerMw : -powerMw;
            var high = double.IsFinite(block.UpperMw) ? block.UpperMw : powerMw;
            largest = Math.Max(largest, Math.Max(Math.Abs(block.MarginalCost(low)), Math.Abs(block.MarginalCost(high))));
        }

        return largest > 0 ? largest : 1;
    }

    private double[] ScaledSusceptance(out double typical)
    {
        var size = Array.ConvertAll(Graph.SusceptanceMwPerRad, Math.Abs);
        Array.Sort(size);
        var middle = size.Length == 0 ? 1 : size[size.Length / 2];
        typical = middle;
        return Array.ConvertAll(Graph.SusceptanceMwPerRad, b => b / middle);
    }

    /// <summary>
    /// A line can only bind if its limit is below what its island can move at all: with positive reactances no line carries
    /// more than the total of what is put in, since every transfer factor lies in [−1, 1].
    /// </summary>
    private (List<int> Limited, List<int> Pinned) ChooseLines(ReadOnlySpan<Block> blocks)
    {
        var most = new double[Graph.BusCount];
        for (var i = 0; i < most.Length; i++)
            most[i] = -Demand[i];
        foreach (var k in FreeBlock)
            most[blocks[k].Bus] += blocks[k].UpperMw / PowerMw;
        var transfer = new double[Graph.IslandCount];
        for (var i = 0; i < most.Length; i++)
            transfer[Graph.IslandOf[i]] += Math.Max(0, most[i]);
        for (var l = 0; l < Graph.LineCount; l++)
        {
            if (Susceptance[l] < 0)
                transfer[Graph.IslandOf[Graph.From[l]]] = double.PositiveInfinity;
        }

        var limited = new List<int>(Graph.LineCount);
        var pinned = new List<int>();
        for (var l = 0; l < Graph.LineCount; l++)
        {
            var limit = Graph.LimitMw[l] / PowerMw;
            if (limit <= NoWidth)
                pinned.Add(l);
            else if (!double.IsPositiveInfinity(limit) && limit <= transfer[Graph.IslandOf[Graph.From[l]]])
                limited.Add(l);
        }

        return (limited, pinned);
    }

    private void FillItems(ReadOnlySpan<Block> blocks)
    {
        for (var j = 0; j < FreeCount; j++)
        {
            var block = blocks[FreeBlock[j]];
            BusOf[j] = block.Bus;
            Lower[j] = block.LowerMw / PowerMw;
            Upper[j] = block.UpperMw / PowerMw;
            Cost[j] = block.PricePerMwh / Price;
            Slope[j] = block.SlopePerMw2h * PowerMw / Price;
            IsLinear &= Slope[j] == 0;
        }

        for (var j = FreeCount; j < LimitedEnd; j++)
        {
            Upper[j] = Graph.LimitMw[LineOfItem[j - FreeCount]] / PowerMw;
            Lower[j] = -Upper[j];
        }

        // A line held at zero is an equality: no bounds, and a multiplier of either sign in the place of the upper one.
        for (var j = LimitedEnd; j < Count; j++)
            (Lower[j], Upper[j]) = (double.NegativeInfinity, double.PositiveInfinity);
    }
}
