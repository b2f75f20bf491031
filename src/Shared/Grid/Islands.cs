namespace Halfvoice.Grid;

/// <summary>The parts of a network that no line joins to each other. Each must balance by itself.</summary>
public static class Islands
{
    /// <summary>Bus indices of every island, ascending; islands in the order of their first bus. O(buses + lines).</summary>
    public static IReadOnlyList<int[]> Of(Network network)
    {
        var seen = new bool[network.Buses.Count];
        var islands = new List<int[]>();
        var open = new Stack<int>();
        for (var first = 0; first < seen.Length; first++)
        {
            if (seen[first])
                continue;
            var island = new List<int>();
            seen[first] = true;
            open.Push(first);
            while (open.TryPop(out var bus))
            {
                island.Add(bus);
                foreach (var line in network.LinesAt(bus))
                {
                    var (from, to) = (network.Lines[line].FromBus, network.Lines[line].ToBus);
                    var other = from == bus ? to : from;
                    if (seen[other])
                        continue;
                    seen[other] = true;
                    open.Push(other);
                }
            }

            island.Sort();
            islands.Add([.. island]);
        }

        return islands;
    }
}
