namespace Halfvoice.Optimization;

/// <summary>Whether every island's blocks can meet its demand at all, lines aside.</summary>
internal sealed class IslandBalance
{
    public IslandBalance(GridGraph graph, ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw)
    {
        if (demandMw.Length != graph.BusCount)
            throw new ArgumentException($"{demandMw.Length} loads were given for {graph.BusCount} buses.", nameof(demandMw));
        var shortMw = new double[graph.IslandCount];
        var excessMw = new double[graph.IslandCount];
        for (var i = 0; i < demandMw.Length; i++)
        {
            shortMw[graph.IslandOf[i]] += demandMw[i];
            excessMw[graph.IslandOf[i]] -= demandMw[i];
            TotalLoadMw += Math.Abs(demandMw[i]);
        }

        foreach (var block in blocks)
        {
            shortMw[graph.IslandOf[block.Bus]] -= block.UpperMw;
            excessMw[graph.IslandOf[block.Bus]] += block.LowerMw;
        }

        for (var island = 0; island < shortMw.Length; island++)
        {
            CapacityShortMw += Math.Max(0, shortMw[island]);
            MinimumExcessMw += Math.Max(0, excessMw[island]);
            WorstMw = Math.Max(WorstMw, Math.Max(shortMw[island], excessMw[island]));
        }
    }

    /// <summary>Σ |demand|, MW.</summary>
    public double TotalLoadMw { get; }

    /// <summary>Demand beyond the upper limits, summed over the islands where it is, MW.</summary>
    public double CapacityShortMw { get; }

    /// <summary>Lower limits beyond demand, summed over the islands where they are, MW.</summary>
    public double MinimumExcessMw { get; }

    /// <summary>The larger of both in the worst island, MW.</summary>
    public double WorstMw { get; }
}
