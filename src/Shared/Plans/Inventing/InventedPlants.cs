using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>Loads and plants for an invented network. Megawatts and prices are of a plausible size and otherwise made up.</summary>
internal static class InventedPlants
{
    private enum Kind
    {
        Rising,
        Flat,
        Weather,
        River,
        Battery,
    }

    // The mix repeats, so that even a small plan has plants of several kinds: out of 15, 5 rising, 4 flat, 3 wind or sun.
    private static readonly Kind[] Mix =
    [
        Kind.Rising, Kind.Flat, Kind.Weather, Kind.Rising, Kind.Battery, Kind.Flat, Kind.Rising, Kind.River,
        Kind.Weather, Kind.Flat, Kind.Rising, Kind.Battery, Kind.Weather, Kind.Rising, Kind.Flat,
    ];

    /// <summary>About 57 % of the sites have load alone; at least two sites have plants, or no line could be made to bind.</summary>
    public static bool[] ChooseSitesWithPlants(int sites, SeededNumbers numbers)
    {
        var chosen = new bool[sites];
        foreach (var site in numbers.Order(sites).Take(Math.Clamp((int)Math.Round(0.43 * sites), 2, sites - 1)))
            chosen[site] = true;
        return chosen;
    }

    /// <summary>Load of each bus, MW: 5 to 120 where people live, less or none beside a plant.</summary>
    public static double[] Loads(IReadOnlyList<Bus> buses, Func<int, bool> hasPlants, SeededNumbers numbers)
    {
        var loadMw = new double[buses.Count];
        for (var bus = 0; bus < loadMw.Length; bus++)
        {
            var size = numbers.LogBetween(5, 120);
            loadMw[bus] = Math.Round(hasPlants(bus) ? (numbers.Unit() < 0.5 ? 0 : size / 4) : size, 1);
        }

        return loadMw;
    }

    /// <summary>Plants at the given buses, together 1.5 to 1.8 times the load.</summary>
    public static Generator[] Plants(IReadOnlyList<Bus> buses, IReadOnlyList<int> at, double totalLoadMw, SeededNumbers numbers)
    {
        var kinds = at.Select((_, i) => Mix[i % Mix.Length]).ToArray();
        var weight = kinds.Select(kind => numbers.LogBetween(0.5, 2) * WeightOf(kind)).ToArray();
        var scale = numbers.Between(1.5, 1.8) * totalLoadMw / weight.Sum();
        var rank = numbers.Order(at.Count);
        var named = new Dictionary<int, int>();
        var plants = new Generator[at.Count];
        for (var i = 0; i < plants.Length; i++)
        {
            var count = named[at[i]] = named.GetValueOrDefault(at[i]) + 1;
            var name = buses[at[i]].Name + "-" + NameOf(kinds[i], numbers) + (count > 1 ? FormattableString.Invariant($"-{count}") : "");
            var maxMw = Math.Max(4, Math.Round(scale * weight[i]));
            plants[i] = Plant(name, at[i], kinds[i], maxMw, (rank[i] + numbers.Unit()) / at.Count, numbers);
        }

        return plants;
    }

    /// <param name="place">In [0, 1), different for every plant, so that no two flat costs are equal and the optimum is unique.</param>
    private static Generator Plant(string name, int bus, Kind kind, double maxMw, double place, SeededNumbers numbers)
    {
        var fixedCost = Math.Round(numbers.Between(20, 60) + maxMw);
        switch (kind)
        {
            case Kind.Rising:
                var minMw = numbers.Unit() < 0.25 ? Math.Round(0.15 * maxMw) : 0;
                var steep = Slope(numbers.Between(8, 30), maxMw);
                return new Generator(name, bus, minMw, maxMw, steep, Math.Round(numbers.Between(14, 38), 2), fixedCost);
            case Kind.Flat:
                return new Generator(name, bus, 0, maxMw, 0, Math.Round(20 + (55 * place), 4), fixedCost);
            case Kind.Weather:
                return new Generator(name, bus, 0, maxMw, 0, 0);
            case Kind.River:
                return new Generator(name, bus, maxMw, maxMw, 0, 0);
            default:
                var gentle = Slope(numbers.Between(4, 10), maxMw);
                return new Generator(name, bus, -maxMw, maxMw, gentle, Math.Round(numbers.Between(30, 42), 2));
        }
    }

    /// <summary>a such that the marginal cost rises by so many $/MWh from 0 to full output.</summary>
    private static double Slope(double risePerMwh, double maxMw) => Math.Max(1e-5, Math.Round(risePerMwh / (2 * maxMw), 5));

    private static double WeightOf(Kind kind) => kind switch
    {
        Kind.Rising => 1.2,
        Kind.Flat => 1.0,
        Kind.Weather => 0.6,
        _ => 0.25,
    };

    private static string NameOf(Kind kind, SeededNumbers numbers) => kind switch
    {
        Kind.Rising => numbers.Pick(["steam", "hydro", "engines"]),
        Kind.Flat => numbers.Pick(["gas", "turbine", "biogas"]),
        Kind.Weather => numbers.Pick(["wind", "solar"]),
        Kind.River => "river",
        _ => "battery",
    };
}
