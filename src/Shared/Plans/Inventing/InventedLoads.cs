using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>Loads of an invented region over time: a gentle common drift and a variation of each bus.</summary>
internal static class InventedLoads
{
    private const int FirstMinute = 7 * 60;
    private const int MinutesApart = 5;

    /// <summary>Snapshots of all buses, MW: within about 3 % of the base by drift and 1 % by variation.</summary>
    public static double[][] OverTime(double[] baseMw, int snapshots, SeededNumbers numbers)
    {
        var (start, period) = (numbers.Unit(), numbers.Between(14, 30));
        var variation = new double[baseMw.Length];
        var series = new double[snapshots][];
        for (var snapshot = 0; snapshot < snapshots; snapshot++)
        {
            var drift = 0.03 * (Math.Sin(2 * Math.PI * (start + (snapshot / period))) - Math.Sin(2 * Math.PI * start)) / 2;
            series[snapshot] = new double[baseMw.Length];
            for (var bus = 0; bus < baseMw.Length; bus++)
            {
                variation[bus] = (0.8 * variation[bus]) + numbers.Between(-0.006, 0.006);
                series[snapshot][bus] = Math.Round(baseMw[bus] * (1 + drift + variation[bus]), 2);
            }
        }

        return series;
    }

    /// <summary>The same loads as each site has them.</summary>
    public static Dictionary<string, LoadSeries> BySite(Network network, double[][] loadMw)
    {
        string[] times = loadMw.Length == 1 ? [] : [.. Enumerable.Range(0, loadMw.Length).Select(TimeOf)];
        return network.Sites.ToDictionary(
            site => site,
            site => new LoadSeries(times, Array.ConvertAll(loadMw, all => network.BusesOf(site).Select(bus => all[bus]).ToArray())),
            StringComparer.Ordinal);
    }

    /// <summary>Five minutes apart from seven in the morning of an arbitrary day; a long series runs into the next day.</summary>
    private static string TimeOf(int snapshot)
    {
        var minute = FirstMinute + (MinutesApart * snapshot);
        return FormattableString.Invariant($"2031-03-{4 + (minute / 1440):00}T{minute / 60 % 24:00}:{minute % 60:00}");
    }
}
