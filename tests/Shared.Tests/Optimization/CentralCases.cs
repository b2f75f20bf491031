using System.Globalization;
using System.Text.Json;
using Halfvoice.Grid;

namespace Halfvoice.Tests.Optimization;

/// <summary>Reads the benchmark networks beside the project; only as much of a plan folder as these tests need.</summary>
internal static class CentralCases
{
    /// <summary>Network, loads by bus (MW) and published cost ($/h); skips the calling test where the folder is missing.</summary>
    public static (Network Network, double[] LoadMw, double CostPerHour) Read(string name)
    {
        var folder = Folder(name);
        Assert.SkipWhen(folder is null, $"The benchmark networks (../shared/cases/{name}) are not beside this project.");
        var buses = Rows(folder!, "grid/buses.csv").Select(row => new Bus(row["bus"], row["site"])).ToArray();
        var index = buses.Select((bus, i) => (bus.Name, i)).ToDictionary(pair => pair.Name, pair => pair.i);
        var lines = Rows(folder!, "grid/lines.csv").Select(row => new Line(
            row["line"], index[row["from_bus"]], index[row["to_bus"]], Number(row["reactance_pu"]),
            row["limit_mw"].Length == 0 ? double.PositiveInfinity : Number(row["limit_mw"]))).ToArray();
        var generators = Rows(folder!, "grid/generators.csv").Select(row => new Generator(
            row["generator"], index[row["bus"]], Number(row["min_mw"]), Number(row["max_mw"]), Number(row["cost_quadratic"]),
            Number(row["cost_linear"]), Number(row["cost_fixed"]))).ToArray();
        var load = new double[buses.Length];
        foreach (var file in Directory.GetFiles(Path.Combine(folder!, "loads"), "*.csv"))
        {
            foreach (var row in Rows(folder!, Path.Combine("loads", Path.GetFileName(file))))
                load[index[row["bus"]]] += Number(row["load_mw"]);
        }

        using var expected = JsonDocument.Parse(File.ReadAllText(Path.Combine(folder!, "expected.json")));
        return (new Network(100, buses, lines, generators), load, expected.RootElement.GetProperty("cost_per_hour").GetDouble());
    }

    private static string? Folder(string name)
    {
        for (var at = new DirectoryInfo(AppContext.BaseDirectory); at is not null; at = at.Parent)
        {
            if (!File.Exists(Path.Combine(at.FullName, "Agents.sln")))
                continue;
            var folder = Path.Combine(at.FullName, "..", "shared", "cases", name);
            return Directory.Exists(folder) ? folder : null;
        }

        return null;
    }

    private static List<Dictionary<string, string>> Rows(string folder, string file)
    {
        var lines = File.ReadAllLines(Path.Combine(folder, file));
        var header = lines[0].Split(',');
        return lines.Skip(1).Where(line => line.Length > 0)
            .Select(line => header.Zip(line.Split(',')).ToDictionary(pair => pair.First, pair => pair.Second)).ToList();
    }

    private static double Number(string text) => double.Parse(text, CultureInfo.InvariantCulture);
}
