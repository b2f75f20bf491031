using Halfvoice.Grid;

namespace Halfvoice.Tests.Optimization;

/// <summary>
/// Random networks with everything that a plan may hold: parallel lines, negative reactances, unlimited lines and lines at 0 MW,
/// islands, buses without plants, plants without a range, negative loads.
/// </summary>
internal static class CentralNetworks
{
    public static (Network Network, double[] LoadMw) Random(Random random, bool quadratic, double tightness = 1)
    {
        var islands = random.Next(5) == 0 ? 2 : 1;
        var buses = new List<Bus>();
        var lines = new List<Line>();
        var generators = new List<Generator>();
        var load = new List<double>();
        for (var island = 0; island < islands; island++)
            AddIsland(random, quadratic, tightness, buses, lines, generators, load);
        return (new Network(100, buses, lines, generators), load.ToArray());
    }

    private static void AddIsland(
        Random random, bool quadratic, double tightness, List<Bus> buses, List<Line> lines, List<Generator> generators, List<double> load)
    {
        var first = buses.Count;
        var count = random.Next(2, 16);
        for (var i = 0; i < count; i++)
            buses.Add(new Bus($"B{first + i}", $"S{first + i}"));
        for (var i = 1; i < count; i++)
            AddLine(random, first + random.Next(Math.Max(0, i - 4), i), first + i, tightness, lines);
        for (var extra = random.Next(count + 1); extra > 0; extra--)
        {
            var a = random.Next(count);
            var b = random.Next(count);
            if (a != b)
                AddLine(random, first + a, first + b, tightness, lines);
        }

        double total = 0;
        for (var i = 0; i < count; i++)
        {
            var mw = random.Next(6) switch { 0 => 0, 1 => -20 * random.NextDouble(), _ => 100 * random.NextDouble() };
            load.Add(mw);
            total += mw;
        }

        double capacity = 0;
        for (var g = 0; g == 0 || capacity < (1.1 + random.NextDouble()) * Math.Max(total, 10); g++)
        {
            var min = random.Next(4) switch { 0 => 10 * random.NextDouble(), 1 => -15 * random.NextDouble(), _ => 0 };
            var max = min + (random.Next(6) == 0 ? 0 : 20 + (150 * random.NextDouble()));
            var slope = quadratic && random.Next(3) != 0 ? 0.2 * random.NextDouble() : 0;
            var price = random.Next(8) == 0 ? 0 : (60 * random.NextDouble()) - 5;
            generators.Add(new Generator($"G{generators.Count}", first + random.Next(count), min, max, slope, price, random.Next(50)));
            capacity += max;
        }
    }

    private static void AddLine(Random random, int from, int to, double tightness, List<Line> lines)
    {
        var reactance = 0.01 + (0.2 * random.NextDouble());
        if (random.Next(12) == 0)
            reactance = -0.3 * reactance;
        var limit = random.Next(10) switch
        {
            0 or 1 or 2 => double.PositiveInfinity,
            3 => random.Next(10) == 0 ? 0 : 60 * random.NextDouble() / tightness,
            _ => (100 + (300 * random.NextDouble())) / tightness,
        };
        var swap = random.Next(2) == 0;
        lines.Add(new Line($"L{lines.Count}", swap ? to : from, swap ? from : to, reactance, limit));
        if (random.Next(10) == 0)
            lines.Add(new Line($"L{lines.Count}", from, to, 0.5 * Math.Abs(reactance), limit));
    }
}
