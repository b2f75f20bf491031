using System.Globalization;
using System.Text;
using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>
/// Writes a plan as the texts of a plan folder, so that reading them gives an equal plan back. Every setting is written
/// out, defaults included: a plan made by a tool then shows what can be changed.
/// </summary>
public static class PlanWriter
{
    /// <summary>Texts by file name: plan.yaml, the three grid files, and a load file for each site that has load.</summary>
    /// <param name="plan">Any plan that <see cref="PlanReader"/> could have read.</param>
    /// <param name="comment">Lines to put at the top of plan.yaml as comments; may be empty.</param>
    public static IReadOnlyDictionary<string, string> Write(Plan plan, string comment = "")
    {
        var files = new Dictionary<string, string>(StringComparer.Ordinal)
        {
            [PlanFileRules.Yaml] = PlanYamlWriter.Write(plan, comment),
            [PlanFileRules.Buses] = Buses(plan.Network),
            [PlanFileRules.Lines] = Lines(plan.Network),
            [PlanFileRules.Generators] = Generators(plan.Network),
        };
        foreach (var site in plan.Network.Sites)
        {
            var series = plan.Loads[site];
            if (series.Times.Count > 0 || series.At(1).Any(load => load != 0))
                files[PlanFileRules.LoadFile(site)] = Loads(plan.Network, site, series);
        }

        return files;
    }

    private static string Buses(Network network)
    {
        var labelled = network.Buses.Any(bus => bus.Label is not null || bus.X is not null || bus.Y is not null);
        var text = new StringBuilder(labelled ? "bus,site,name,x,y\n" : "bus,site\n");
        foreach (var bus in network.Buses)
        {
            Row(text, labelled
                ? [bus.Name, bus.Site, bus.Label ?? "", Optional(bus.X), Optional(bus.Y)]
                : [bus.Name, bus.Site]);
        }

        return text.ToString();
    }

    private static string Lines(Network network)
    {
        var extended = network.Lines.Any(line => line.ResistancePu is not null || line.EmergencyLimitMw is not null);
        var text = new StringBuilder("line,from_bus,to_bus,reactance_pu,limit_mw");
        text.Append(extended ? ",resistance_pu,emergency_limit_mw\n" : "\n");
        foreach (var line in network.Lines)
        {
            string[] fields =
            [
                line.Name, network.Buses[line.FromBus].Name, network.Buses[line.ToBus].Name, Quantity.Number(line.ReactancePu),
                double.IsPositiveInfinity(line.LimitMw) ? "" : Quantity.Number(line.LimitMw),
            ];
            Row(text, extended ? [.. fields, Optional(line.ResistancePu), Optional(line.EmergencyLimitMw)] : fields);
        }

        return text.ToString();
    }

    private static string Generators(Network network)
    {
        var text = new StringBuilder("generator,bus,min_mw,max_mw,cost_quadratic,cost_linear,cost_fixed\n");
        foreach (var plant in network.Generators)
        {
            Row(text,
            [
                plant.Name, network.Buses[plant.Bus].Name, Quantity.Number(plant.MinMw), Quantity.Number(plant.MaxMw),
                Quantity.Number(plant.CostQuadratic), Quantity.Number(plant.CostLinear), Quantity.Number(plant.CostFixed),
            ]);
        }

        return text.ToString();
    }

    private static string Loads(Network network, string site, LoadSeries series)
    {
        var timed = series.Times.Count > 0;
        var buses = network.BusesOf(site);
        var text = new StringBuilder(timed ? "time,bus,load_mw\n" : "bus,load_mw\n");
        for (var snapshot = 1; snapshot <= series.Count; snapshot++)
        {
            var loadMw = series.At(snapshot);
            for (var i = 0; i < buses.Count; i++)
            {
                var (bus, value) = (network.Buses[buses[i]].Name, Quantity.Number(loadMw[i]));
                Row(text, timed ? [series.Times[snapshot - 1], bus, value] : [bus, value]);
            }
        }

        return text.ToString();
    }

    private static void Row(StringBuilder text, string[] fields)
    {
        for (var i = 0; i < fields.Length; i++)
        {
            if (i > 0)
                text.Append(',');
            Field(text, fields[i]);
        }

        text.Append('\n');
    }

    private static void Field(StringBuilder text, string field)
    {
        var hasBlankEnds = field.Length > 0 && (char.IsWhiteSpace(field[0]) || char.IsWhiteSpace(field[^1]));
        if (hasBlankEnds || field.AsSpan().ContainsAny("\",\r\n"))
            text.Append('"').Append(field.Replace("\"", "\"\"", StringComparison.Ordinal)).Append('"');
        else
            text.Append(field);
    }

    private static string Optional(double? value) => value is { } number ? number.ToString("R", CultureInfo.InvariantCulture) : "";
}
