using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Tests.Optimization;

/// <summary>Random site problems from a seed. Every instance is a function of its seed alone, so a failure can be repeated.</summary>
internal static class SiteInstances
{
    public const double UnservedPrice = 5_000;

    public static Generator[] Generators(Random random, int most, int buses = 1)
    {
        var count = random.Next(0, most + 1);
        var sharedPrice = Math.Round(10 + (60 * random.NextDouble()));
        return Enumerable.Range(0, count).Select(i => Generator(random, $"g{i}", random.Next(buses), sharedPrice)).ToArray();
    }

    /// <summary>Quadratic, linear, tied, free of charge, fixed, or a battery that may charge.</summary>
    private static Generator Generator(Random random, string name, int bus, double sharedPrice)
    {
        var min = random.Next(4) switch { 0 => 0, 1 => -100 * random.NextDouble(), _ => 100 * random.NextDouble() };
        var max = min + (400 * random.NextDouble());
        var quadratic = 0.002 + (0.3 * random.NextDouble());
        var linear = 10 + (60 * random.NextDouble());
        return random.Next(7) switch
        {
            0 => new Generator(name, bus, min, max, 0, linear),
            1 => new Generator(name, bus, min, max, 0, sharedPrice),
            2 => new Generator(name, bus, min, max, 0, 0),
            3 => new Generator(name, bus, min, min, quadratic, linear),
            4 => new Generator(name, bus, min, max, quadratic, sharedPrice),
            _ => new Generator(name, bus, min, max, quadratic, linear),
        };
    }

    public static double LogUniform(Random random, double low, double high) =>
        low * Math.Pow(high / low, random.NextDouble());

    public static double Susceptance(Random random) =>
        LogUniform(random, 100, 10_000) * (random.Next(6) == 0 ? -1 : 1);

    public static double Limit(Random random) => random.Next(8) switch
    {
        0 or 1 => double.PositiveInfinity,
        2 => 0,
        3 or 4 => 5 + (20 * random.NextDouble()),
        _ => 20 + (400 * random.NextDouble()),
    };

    public static NodalInstance Nodal(int seed)
    {
        var random = new Random(seed);
        var neighbours = random.Next(0, 7);
        var even = random.Next(4) == 0;
        var evenWeight = LogUniform(random, 1e3, 1e7);
        var evenSusceptance = Susceptance(random);
        var evenLimit = Limit(random);
        var weights = Enumerable.Range(0, neighbours + 1).Select(_ => even ? evenWeight : LogUniform(random, 1e3, 1e7)).ToArray();
        var lines = new List<NodalLine>();
        for (var c = 1; c <= neighbours; c++)
        {
            for (var parallel = random.Next(5) == 0 ? 2 : 1; parallel > 0; parallel--)
                lines.Add(even ? new NodalLine(c, evenSusceptance, evenLimit) : new NodalLine(c, Susceptance(random), Limit(random)));
        }

        var anchors = weights.Select(_ => even && random.Next(2) == 0 ? 0 : 0.6 * (random.NextDouble() - 0.5)).ToArray();
        var load = random.Next(8) == 0 ? 4000 * (random.NextDouble() - 0.5) : 500 * (random.NextDouble() - 0.2);
        return new NodalInstance(Generators(random, 4), weights, [.. lines], load, anchors);
    }
}

/// <summary>One problem of a one-bus site.</summary>
internal sealed record NodalInstance(
    Generator[] Generators, double[] Weights, NodalLine[] Lines, double LoadMw, double[] AnchorRad)
{
    public NodalAngleProblem Problem() =>
        new(new SupplyCurve(Generators), Weights, Lines, SiteInstances.UnservedPrice);
}
