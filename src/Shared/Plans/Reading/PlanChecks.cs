using System.Globalization;
using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>What must hold between the parts of a plan once each of them has been read without error.</summary>
internal static class PlanChecks
{
    /// <param name="plan">The plan as read.</param>
    /// <param name="problems">Takes what is found.</param>
    /// <param name="linesFile">The file that the lines came from, for messages.</param>
    public static void Run(Plan plan, PlanProblems problems, string linesFile = PlanFileRules.Lines)
    {
        CheckIslands(plan, problems, linesFile);
        WarnOfTiming(plan, problems);
        WarnOfLoads(plan, problems);
    }

    /// <summary>
    /// Each island must be able to balance. A single island whose plants are too small is left to the central optimum,
    /// which explains it in MW; here its lack of any plant is an error, and so is an island that cannot meet its load.
    /// </summary>
    private static void CheckIslands(Plan plan, PlanProblems problems, string linesFile)
    {
        var network = plan.Network;
        var islands = Islands.Of(network);
        var ranges = LoadRanges(plan, islands);
        for (var i = 0; i < islands.Count; i++)
        {
            var island = islands[i];
            var plants = island.SelectMany(network.GeneratorsAt).Select(index => network.Generators[index]).ToArray();
            var (least, most) = (plants.Sum(plant => plant.MinMw), plants.Sum(plant => plant.MaxMw));
            var slack = 1e-6 * (1 + Math.Abs(least) + Math.Abs(most));
            var names = GridRules.BusNames(network, island);
            if (plants.Length == 0 && ranges[i].HasLoad)
                problems.In(linesFile).Whole(
                    $"leaves an island with load but without a generator: buses {names}: join it to the rest, or give it a generator");
            else if (islands.Count > 1 && (ranges[i].Least < least - slack || ranges[i].Most > most + slack))
                problems.In(linesFile).Whole(
                    $"leaves an island whose generators cannot meet its load: buses {names}: join it to the rest, or change its generators");
        }

        if (islands.Count == 1)
            return;
        var smallest = GridRules.BusNames(network, islands.MinBy(island => island.Length)!);
        problems.Warn(linesFile, null, string.Create(
            CultureInfo.InvariantCulture,
            $"leaves {islands.Count} islands, each of which must balance by itself; the smallest is {smallest}"));
    }

    /// <summary>Least and most total load of each island over all snapshots, and whether any of its buses has load.</summary>
    private static (double Least, double Most, bool HasLoad)[] LoadRanges(Plan plan, IReadOnlyList<int[]> islands)
    {
        var ranges = new (double Least, double Most, bool HasLoad)[islands.Count];
        Array.Fill(ranges, (double.PositiveInfinity, double.NegativeInfinity, false));
        for (var cycle = 1; cycle <= plan.Loads.Values.Max(series => series.Count); cycle++)
        {
            var loadMw = plan.LoadMw(cycle);
            for (var i = 0; i < ranges.Length; i++)
            {
                var sum = islands[i].Sum(bus => loadMw[bus]);
                ranges[i] = (
                    Math.Min(ranges[i].Least, sum),
                    Math.Max(ranges[i].Most, sum),
                    ranges[i].HasLoad || Array.Exists(islands[i], bus => loadMw[bus] != 0));
            }
        }

        return ranges;
    }

    private static void WarnOfTiming(Plan plan, PlanProblems problems)
    {
        if (plan.Accept.SettleWithin is { } within && within > plan.Interval)
            problems.Warn(PlanFileRules.Yaml, null, "accept.settle_within is longer than the interval: the dispatch may come too late");
        if (plan.Rounds.Deadline >= plan.Interval)
            problems.Warn(PlanFileRules.Yaml, null,
                "rounds.deadline is not shorter than the interval: one late site can hold up a whole cycle");
        if (plan.Loads.Values.FirstOrDefault(series => series.Times.Count > 1) is not { } timed)
            return;
        for (var i = 1; i < timed.Times.Count; i++)
        {
            LoadTime.TryRead(timed.Times[i - 1], out var before);
            LoadTime.TryRead(timed.Times[i], out var after);
            if (after.Instant - before.Instant == plan.Interval)
                continue;
            problems.Warn(PlanFileRules.LoadFolder, null,
                $"the times {timed.Times[i - 1]} and {timed.Times[i]} are not one interval ({Quantity.Duration(plan.Interval)}) apart: "
                + "cycles take the snapshots in order whatever their times");
            return;
        }
    }

    private static void WarnOfLoads(Plan plan, PlanProblems problems)
    {
        var isIdle = plan.Loads.Values.All(series =>
            Enumerable.Range(1, series.Count).All(cycle => series.At(cycle).All(load => load == 0)));
        if (isIdle)
            problems.Warn(PlanFileRules.LoadFolder, null, "every load is 0 MW");
    }
}
