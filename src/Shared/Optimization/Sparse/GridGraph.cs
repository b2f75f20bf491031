using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>
/// What the solvers need of a network, in flat arrays: line ends, susceptances and limits, one edge per pair of joined buses,
/// islands, and the elimination pattern. Immutable; safe to share between threads.
/// </summary>
internal sealed class GridGraph
{
    public GridGraph(Network network)
    {
        BusCount = network.Buses.Count;
        LineCount = network.Lines.Count;
        From = new int[LineCount];
        To = new int[LineCount];
        SusceptanceMwPerRad = new double[LineCount];
        LimitMw = new double[LineCount];
        EdgeOfLine = new int[LineCount];
        var edges = new Dictionary<(int, int), int>(LineCount);
        for (var l = 0; l < LineCount; l++)
        {
            var line = network.Lines[l];
            From[l] = line.FromBus;
            To[l] = line.ToBus;
            SusceptanceMwPerRad[l] = network.SusceptanceMwPerRad(l);
            LimitMw[l] = line.LimitMw;
            if (!double.IsFinite(SusceptanceMwPerRad[l]) || SusceptanceMwPerRad[l] == 0)
                throw new ArgumentException($"Line {line.Name} needs a reactance that is finite and not zero.", nameof(network));
            if (!(line.LimitMw >= 0))
                throw new ArgumentException($"Line {line.Name} needs a limit of at least 0 MW.", nameof(network));
            var pair = (Math.Min(From[l], To[l]), Math.Max(From[l], To[l]));
            if (!edges.TryGetValue(pair, out var edge))
                edges.Add(pair, edge = edges.Count);
            EdgeOfLine[l] = edge;
        }

        EdgeA = new int[edges.Count];
        EdgeB = new int[edges.Count];
        foreach (var ((a, b), edge) in edges)
            (EdgeA[edge], EdgeB[edge]) = (a, b);
        (IslandOf, ReferenceBus) = Islands();
        Pattern = SymbolicFactor.Of(BusCount, EdgeA, EdgeB);
    }

    public int BusCount { get; }

    public int LineCount { get; }

    public int[] From { get; }

    public int[] To { get; }

    /// <summary>flow (MW) = susceptance · (θ_from − θ_to); negative for a series capacitor.</summary>
    public double[] SusceptanceMwPerRad { get; }

    /// <summary>At least 0; positive infinity where there is no limit.</summary>
    public double[] LimitMw { get; }

    /// <summary>Parallel lines share an edge.</summary>
    public int[] EdgeOfLine { get; }

    public int[] EdgeA { get; }

    public int[] EdgeB { get; }

    /// <summary>Island of a bus, numbered by first bus.</summary>
    public int[] IslandOf { get; }

    /// <summary>The first bus of every island; its angle is 0.</summary>
    public int[] ReferenceBus { get; }

    public int IslandCount => ReferenceBus.Length;

    /// <summary>Pattern of every matrix with one row per bus and one entry per edge.</summary>
    public SymbolicFactor Pattern { get; }

    private (int[] Island, int[] Reference) Islands()
    {
        var root = new int[BusCount];
        for (var i = 0; i < BusCount; i++)
            root[i] = i;
        for (var e = 0; e < EdgeA.Length; e++)
        {
            var a = Find(root, EdgeA[e]);
            var b = Find(root, EdgeB[e]);
            root[Math.Max(a, b)] = Math.Min(a, b);
        }

        var island = new int[BusCount];
        var reference = new List<int>();
        for (var i = 0; i < BusCount; i++)
        {
            var first = Find(root, i);
            if (first == i)
            {
                island[i] = reference.Count;
                reference.Add(i);
            }
            else
            {
                island[i] = island[first];
            }
        }

        return (island, reference.ToArray());
    }

    private static int Find(int[] root, int vertex)
    {
        while (root[vertex] != vertex)
        {
            root[vertex] = root[root[vertex]];
            vertex = root[vertex];
        }

        return vertex;
    }
}
