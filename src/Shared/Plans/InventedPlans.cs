using System.Globalization;
using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>
/// Makes plausible plans of regions that do not exist: a meshed network on a map, loads over an hour, plants of several
/// kinds, limits that bind somewhere, and settings to start from. The same arguments give the same plan.
/// </summary>
public static class InventedPlans
{
    public const int LeastSites = 3;
    public const int MostSites = 5000;
    public const int MostBusesPerSite = 20;
    public const int MostSnapshots = 288;

    private const int MostAttempts = 64;
    private const double ReactancePuPerKm = 0.0016;
    private const double BaseMva = 100;

    /// <param name="sites">3 to 5,000.</param>
    /// <param name="seed">Any number.</param>
    /// <param name="busesPerSite">1 to 20; above 1 sites are contiguous areas of about this many buses.</param>
    /// <param name="snapshots">Five-minute snapshots of the loads, 1 to 288.</param>
    /// <exception cref="ArgumentOutOfRangeException">An argument outside its range.</exception>
    public static Plan Make(int sites, long seed, int busesPerSite = 1, int snapshots = 12)
    {
        ArgumentOutOfRangeException.ThrowIfLessThan(sites, LeastSites);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(sites, MostSites);
        ArgumentOutOfRangeException.ThrowIfLessThan(busesPerSite, 1);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(busesPerSite, MostBusesPerSite);
        ArgumentOutOfRangeException.ThrowIfLessThan(snapshots, 1);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(snapshots, MostSnapshots);
        var numbers = new SeededNumbers(seed);
        for (var attempt = 0; attempt < MostAttempts; attempt++)
        {
            if (Try(sites, busesPerSite, snapshots, numbers, seed) is { } plan)
                return plan;
        }

        throw new InvalidOperationException("No line of the invented networks could be made to bind.");
    }

    private static Plan? Try(int sites, int busesPerSite, int snapshots, SeededNumbers numbers, long seed)
    {
        var names = new InventedNames(numbers);
        var region = names.Region();
        var map = InventedMap.Draw(sites * busesPerSite, numbers);
        var owner = InventedSites.Divide(map, sites, numbers);
        var (buses, indexOf) = Buses(map, owner, sites, names);
        var withPlants = InventedPlants.ChooseSitesWithPlants(sites, numbers);
        var siteOf = buses.Select(bus => bus.Site).Distinct().Select((name, i) => (name, i))
            .ToDictionary(pair => pair.name, pair => pair.i, StringComparer.Ordinal);
        var baseLoad = InventedPlants.Loads(buses, bus => withPlants[siteOf[buses[bus].Site]], numbers);
        var plants = InventedPlants.Plants(buses, PlantBuses(buses, siteOf, withPlants, numbers), baseLoad.Sum(), numbers);
        var lines = Lines(map, buses, indexOf, numbers);
        var loadMw = InventedLoads.OverTime(baseLoad, snapshots, numbers);
        var network = new Network(BaseMva, buses, lines, plants);
        if (InventedLimits.Choose(network, loadMw, numbers) is not { } limits)
            return null;
        network = new Network(BaseMva, buses, [.. lines.Select((line, l) => line with { LimitMw = limits[l] })], plants);
        var name = string.Create(CultureInfo.InvariantCulture, $"{region}, invented from seed {seed}");
        return InventedSettings.Around(name, network, InventedLoads.BySite(network, loadMw), loadMw[0].Sum());
    }

    /// <summary>Buses ordered by site, and the index that each point of the map got.</summary>
    private static (Bus[] Buses, int[] IndexOf) Buses(InventedMap map, int[] owner, int sites, InventedNames names)
    {
        var pointsOf = owner.Select((site, point) => (site, point)).ToLookup(pair => pair.site, pair => pair.point);
        var buses = new Bus[owner.Length];
        var indexOf = new int[owner.Length];
        var next = 0;
        for (var site = 0; site < sites; site++)
        {
            var place = names.Place();
            var label = char.ToUpperInvariant(place[0]) + place[1..];
            var points = pointsOf[site].ToArray();
            for (var i = 0; i < points.Length; i++)
            {
                var suffix = points.Length == 1 ? "" : string.Create(CultureInfo.InvariantCulture, $"{i + 1}");
                indexOf[points[i]] = next;
                buses[next++] = new Bus(
                    suffix.Length == 0 ? place : $"{place}-{suffix}",
                    place,
                    suffix.Length == 0 ? label : $"{label} {suffix}",
                    map.X[points[i]],
                    map.Y[points[i]]);
            }
        }

        return (buses, indexOf);
    }

    private static int[] PlantBuses(Bus[] buses, Dictionary<string, int> siteOf, bool[] withPlants, SeededNumbers numbers)
    {
        var order = new List<int>();
        foreach (var site in buses.Select((bus, i) => (siteOf[bus.Site], i)).GroupBy(pair => pair.Item1, pair => pair.i))
        {
            var own = site.ToArray();
            numbers.Shuffle(own);
            if (withPlants[site.Key])
                order.AddRange(own.Take(Math.Max(1, own.Length / 2)));
        }

        var result = order.ToArray();
        numbers.Shuffle(result);
        return result;
    }

    private static Line[] Lines(InventedMap map, Bus[] buses, int[] indexOf, SeededNumbers numbers)
    {
        var lines = new Line[map.Edges.Length];
        for (var l = 0; l < lines.Length; l++)
        {
            var (from, to) = (indexOf[map.Edges[l].From], indexOf[map.Edges[l].To]);
            var reactance = Math.Max(0.004, ReactancePuPerKm * map.LengthKm(l) * numbers.Between(0.85, 1.2));
            lines[l] = new Line($"{buses[from].Name}--{buses[to].Name}", from, to, Math.Round(reactance, 5));
        }

        return lines;
    }
}
