using Halfvoice.Grid;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>
/// A ring of one-bus sites: the first ones have a plant of 0 to 100 MW, the rest only loads. Loads are numbers with digits that
/// occur nowhere else, so that a leak shows.
/// </summary>
internal static class SmallPlan
{
    public static Plan Of(int plants, int loads, int cycles = 1, int roundCap = 50, double quorum = 0.9, int holdRounds = 3)
    {
        var count = plants + loads;
        var buses = Enumerable.Range(0, count).Select(b => new Bus($"b{b}", $"s{b}")).ToArray();
        var lines = Enumerable.Range(0, count).Select(b => new Line($"l{b}", b, (b + 1) % count, 0.1)).Take(count > 2 ? count : count - 1).ToArray();
        var generators = Enumerable.Range(0, plants).Select(b => new Generator($"g{b}", b, 0, 100, 0.05, 20 + b)).ToArray();
        return new Plan
        {
            Name = "Small",
            Cycles = cycles,
            Stop = new StopSettings { ReferenceLoadMw = 100, RoundCap = roundCap },
            Rounds = new RoundSettings { Deadline = TimeSpan.FromSeconds(2), Quorum = quorum, HoldRounds = holdRounds },
            Privacy = new PrivacySettings { Mechanism = MechanismKind.None, Stated = true },
            Network = new Network(100, buses, lines, generators),
            Loads = buses.ToDictionary(bus => bus.Site, bus => new LoadSeries([], [[LoadMw(bus.Site)]])),
        };
    }

    /// <summary>10.618033, 11.618033, …, MW.</summary>
    public static double LoadMw(string site) => 10.618033 + int.Parse(site.AsSpan(1), System.Globalization.CultureInfo.InvariantCulture);
}
