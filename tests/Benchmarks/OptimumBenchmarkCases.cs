using System.Globalization;
using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Benchmarks;

/// <summary>Networks to measure on: benchmark plan folders beside the project, and generated ones of any size.</summary>
internal static class OptimumBenchmarkCases
{
    /// <summary>Reads grid and loads of a plan folder under ../shared/cases; false when it is not there.</summary>
    public static bool TryRead(string name, out Network network, out double[] loadMw)
    {
        network = null!;
        loadMw = [];
        var at = new DirectoryInfo(AppContext.BaseDirectory);
        while (at is not null && !File.Exists(Path.Combine(at.FullName, "Agents.sln")))
            at = at.Parent;
        var folder = at is null ? "" : Path.Combine(at.FullName, "..", "shared", "cases", name);
        if (!Directory.Exists(folder))
            return false;
        var buses = Rows(folder, "grid/buses.csv").Select(row => new Bus(row["bus"], row["site"])).ToArray();
        var index = buses.Select((bus, i) => (bus.Name, i)).ToDictionary(pair => pair.Name, pair => pair.i);
        var lines = Rows(folder, "grid/lines.csv").Select(row => new Line(
            row["line"], index[row["from_bus"]], index[row["to_bus"]], Number(row["reactance_pu"]),
            row["limit_mw"].Length == 0 ? double.PositiveInfinity : Number(row["limit_mw"]))).ToArray();
        var plants = Rows(folder, "grid/generators.csv").Select(row => new Generator(
            row["generator"], index[row["bus"]], Number(row["min_mw"]), Number(row["max_mw"]), Number(row["cost_quadratic"]),
            Number(row["cost_linear"]), Number(row["cost_fixed"]))).ToArray();
        loadMw = new double[buses.Length];
        foreach (var file in Directory.GetFiles(Path.Combine(folder, "loads"), "*.csv"))
        {
            foreach (var row in Rows(folder, Path.Combine("loads", Path.GetFileName(file))))
                loadMw[index[row["bus"]]] += Number(row["load_mw"]);
        }

        network = new Network(100, buses, lines, plants);
        return true;
    }

    /// <summary>
    /// A grid as transmission grids look: buses scattered over a plane, every bus joined to its nearest earlier one and to some
    /// neighbours, about 1.4 lines a bus, plants at every fifth bus with linear costs. Limits start from the flows of an unlimited
    /// dispatch in merit order and are then cut so that part of the lines bind; the least-cost dispatch of a
    /// proportional schedule stays feasible.
    /// </summary>
    public static (Network Network, double[] LoadMw) Generate(int count, int seed)
    {
        var random = new Random(seed);
        var place = Enumerable.Range(0, count).Select(_ => (X: random.NextDouble(), Y: random.NextDouble())).ToArray();
        var buses = place.Select((p, i) => new Bus($"B{i}", $"S{i}", X: p.X, Y: p.Y)).ToArray();
        var pairs = Pairs(random, place);
        var load = new double[count];
        for (var i = 0; i < count; i++)
            load[i] = random.Next(10) < 6 ? 5 + (60 * random.NextDouble()) : 0;
        var total = load.Sum();
        var at = Enumerable.Range(0, count).Where(_ => random.Next(5) == 0).DefaultIfEmpty(0).ToArray();
        var plants = new Generator[at.Length];
        var average = 2 * total / at.Length;
        for (var g = 0; g < plants.Length; g++)
            plants[g] = new Generator($"G{g}", at[g], 0, average * (0.5 + random.NextDouble()), 0, 10 + (50 * random.NextDouble()));
        var reactance = pairs.Select(pair => 0.005 + (0.1 * Distance(place[pair.A], place[pair.B]) * Math.Sqrt(count))
            * (0.5 + random.NextDouble())).ToArray();

        var open = pairs.Select((pair, l) => new Line($"L{l}", pair.A, pair.B, reactance[l])).ToArray();
        var cheap = CentralOptimum.Solve(new Network(100, buses, open, plants), load);
        var capacity = plants.Sum(plant => plant.MaxMw);
        var shares = plants.Select(plant => plant with { MinMw = plant.MaxMw * total / capacity, MaxMw = plant.MaxMw * total / capacity });
        var even = CentralOptimum.Solve(new Network(100, buses, open, shares.ToArray()), load);
        if (cheap.Status != OptimumStatus.Optimal || even.Status != OptimumStatus.Optimal)
            throw new InvalidOperationException("The unlimited network should have an optimum.");
        var lines = open.Select((line, l) => line with
        {
            LimitMw = Math.Max(
                Math.Max(20, 1.05 * Math.Abs(even.FlowMw[l])),
                (random.Next(8) == 0 ? 0.8 : 1.3) * Math.Abs(cheap.FlowMw[l])),
        }).ToArray();
        return (new Network(100, buses, lines, plants), load);
    }

    private static List<(int A, int B)> Pairs(Random random, (double X, double Y)[] place)
    {
        // Buckets of about four buses make the search for neighbours linear in the number of buses.
        var side = Math.Max(1, (int)Math.Sqrt(place.Length / 4.0));
        var cells = new Dictionary<(int, int), List<int>>();
        var pairs = new HashSet<(int A, int B)>();
        for (var i = 0; i < place.Length; i++)
        {
            var cell = ((int)(place[i].X * side), (int)(place[i].Y * side));
            var near = new List<int>();
            for (var ring = 1; near.Count == 0 && i > 0; ring *= 2)
            {
                for (var dx = -ring; dx <= ring; dx++)
                {
                    for (var dy = -ring; dy <= ring; dy++)
                    {
                        if (cells.TryGetValue((cell.Item1 + dx, cell.Item2 + dy), out var found))
                            near.AddRange(found);
                    }
                }
            }

            var sorted = near.OrderBy(j => Distance(place[i], place[j])).Take(2).ToArray();
            if (sorted.Length > 0)
                pairs.Add((sorted[0], i));
            if (sorted.Length > 1 && random.Next(100) < 42)
                pairs.Add((sorted[1], i));
            if (!cells.TryGetValue(cell, out var own))
                cells[cell] = own = [];
            own.Add(i);
        }

        return [.. pairs];
    }

    private static double Distance((double X, double Y) a, (double X, double Y) b) =>
        Math.Sqrt(((a.X - b.X) * (a.X - b.X)) + ((a.Y - b.Y) * (a.Y - b.Y)));

    private static List<Dictionary<string, string>> Rows(string folder, string file)
    {
        var lines = File.ReadAllLines(Path.Combine(folder, file));
        var header = lines[0].Split(',');
        return lines.Skip(1).Where(line => line.Length > 0)
            .Select(line => header.Zip(line.Split(',')).ToDictionary(pair => pair.First, pair => pair.Second)).ToList();
    }

    private static double Number(string text) => double.Parse(text, CultureInfo.InvariantCulture);
}
