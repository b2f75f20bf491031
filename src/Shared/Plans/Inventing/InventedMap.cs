namespace Halfvoice.Plans;

/// <summary>Points on a plane and the lines between them: connected, meshed, and without lines that cross half the map.</summary>
/// <param name="X">East, km.</param>
/// <param name="Y">North, km.</param>
/// <param name="Edges">Pairs of points, the smaller index first, without repetition.</param>
internal sealed record InventedMap(double[] X, double[] Y, (int From, int To)[] Edges)
{
    private const double CellKm = 14;

    /// <summary>Power networks have about 1.2 to 1.6 lines a bus.</summary>
    private const double LinesPerBus = 1.42;

    public double LengthKm(int edge) => Math.Sqrt(Square(Edges[edge].From, Edges[edge].To));

    /// <summary>Draws a map of at least two points. O(points) for the scattered points that it draws itself.</summary>
    public static InventedMap Draw(int points, SeededNumbers numbers)
    {
        var side = (int)Math.Ceiling(Math.Sqrt(1.3 * points));
        var cells = numbers.Order(side * side)[..points];
        Array.Sort(cells);
        var map = new InventedMap(new double[points], new double[points], []);
        for (var i = 0; i < points; i++)
        {
            map.X[i] = Math.Round(CellKm * ((cells[i] % side) + numbers.Between(0.1, 0.9)), 1);
            map.Y[i] = Math.Round(CellKm * ((cells[i] / side) + numbers.Between(0.1, 0.9)), 1);
        }

        for (var reach = 3; ; reach *= 2)
        {
            var candidates = map.Gabriel(cells, side, reach);
            if (map.Mesh(candidates, numbers) is { } edges)
                return map with { Edges = edges };
        }
    }

    /// <summary>
    /// Pairs whose circle over the line between them holds no third point (Gabriel and Sokal, 1969), among the points up
    /// to <paramref name="reach"/> cells apart. Contains the shortest tree once the reach is long enough. Of a handful
    /// of points all pairs are taken, since their Gabriel graph may be a mere tree.
    /// </summary>
    private List<(int From, int To)> Gabriel(int[] cells, int side, int reach)
    {
        var at = new Dictionary<int, int>();
        for (var i = 0; i < cells.Length; i++)
            at[cells[i]] = i;
        var pairs = new List<(int, int)>();
        var near = new List<int>();
        for (var i = 0; i < cells.Length; i++)
        {
            near.Clear();
            var (column, row) = (cells[i] % side, cells[i] / side);
            for (var r = Math.Max(0, row - reach); r <= Math.Min(side - 1, row + reach); r++)
            {
                for (var c = Math.Max(0, column - reach); c <= Math.Min(side - 1, column + reach); c++)
                {
                    if (at.TryGetValue((r * side) + c, out var j) && j != i)
                        near.Add(j);
                }
            }

            foreach (var j in near)
            {
                if (j > i && (cells.Length < 7 || near.TrueForAll(k => k == j || Square(i, k) + Square(j, k) > Square(i, j))))
                    pairs.Add((i, j));
            }
        }

        return pairs;
    }

    /// <summary>The shortest tree (Kruskal, 1956), then a second line for its leaves, then others at random; null if unconnected.</summary>
    private (int From, int To)[]? Mesh(List<(int From, int To)> candidates, SeededNumbers numbers)
    {
        candidates.Sort((a, b) => Square(a.From, a.To).CompareTo(Square(b.From, b.To)) is var order && order != 0 ? order : a.CompareTo(b));
        var group = Enumerable.Range(0, X.Length).ToArray();
        var degree = new int[X.Length];
        var taken = new List<(int From, int To)>();
        var rest = new List<(int From, int To)>();
        foreach (var pair in candidates)
        {
            var (a, b) = (Root(group, pair.From), Root(group, pair.To));
            if (a == b)
            {
                rest.Add(pair);
                continue;
            }

            group[a] = b;
            Take(pair);
        }

        if (taken.Count < X.Length - 1)
            return null;
        var spare = new List<(int From, int To)>();
        foreach (var pair in rest)
        {
            if (degree[pair.From] == 1 || degree[pair.To] == 1)
                Take(pair);
            else
                spare.Add(pair);
        }

        var order = spare.ToArray();
        numbers.Shuffle(order);
        foreach (var pair in order.TakeWhile(_ => taken.Count < LinesPerBus * X.Length))
            Take(pair);
        taken.Sort();
        return [.. taken];

        void Take((int From, int To) pair)
        {
            taken.Add(pair);
            degree[pair.From]++;
            degree[pair.To]++;
        }
    }

    private static int Root(int[] group, int point)
    {
        while (group[point] != point)
            point = group[point] = group[group[point]];
        return point;
    }

    private double Square(int a, int b) => ((X[a] - X[b]) * (X[a] - X[b])) + ((Y[a] - Y[b]) * (Y[a] - Y[b]));
}
