using System.Globalization;
using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>What an import keeps of a bus row.</summary>
internal readonly record struct CdfBus(string Number, double LoadMw, double GenerationMw);

/// <summary>Reads the bus section: number 1–4, name 6–17, area 19–20, type 25–26, voltage 28–33, load 41–49 and so on.</summary>
internal static class CdfBusReader
{
    private const double LargestNumber = 1e9;

    private const string UnreadableRule =
        "cannot be read: after the name come area, zone, type 0 to 3, voltage, angle, load MW and MVAR, generation MW and MVAR";

    public static List<CdfBus> Read(string[] lines, CdfSections sections, ImportSites sitesBy, FileProblems problems, GridDraft draft)
    {
        var buses = new List<CdfBus>();
        var (start, count) = sections.Buses.GetOffsetAndLength(lines.Length);
        for (var i = start; i < start + count; i++)
        {
            if (problems.IsFull)
            {
                problems.StoppedAt(i + 1);
                return buses;
            }

            if (string.IsNullOrWhiteSpace(lines[i]))
                continue;
            if (buses.Count == PlanFileRules.MaxBuses)
            {
                problems.Add(i + 1, null, null, null, "is one bus too many: at most 200,000 are read");
                return buses;
            }

            ReadRow(CdfRow.Of(lines[i], i + 1), sitesBy, problems, draft, buses);
        }

        draft.BusesAreComplete = true;
        if (buses.Count == 0 && problems.Count == 0)
            problems.Whole("has no bus: a plan needs at least one");
        return buses;
    }

    private static void ReadRow(CdfRow row, ImportSites sitesBy, FileProblems problems, GridDraft draft, List<CdfBus> buses)
    {
        var number = row.Number(1, 4);
        if (!IsCount(number) || number == 0)
            number = row.Values(1).FirstOrDefault(double.NaN);
        if (!IsCount(number) || number == 0)
        {
            problems.Add(row.Line, 1, "bus number", row.Words(1, 5), "must be a whole number in columns 1 to 4");
            return;
        }

        var name = number.ToString("0", CultureInfo.InvariantCulture);
        if (!draft.BusAt.TryAdd(name, (draft.Buses.Count, row.Line)))
        {
            problems.Add(row.Line, 1, "bus number", name, $"is there twice, first in line {draft.BusAt[name].Line}");
            return;
        }

        var fields = ByColumn(row) ?? ByOrder(row);
        if (fields is null)
            problems.Add(row.Line, 19, null, null, UnreadableRule);
        var (area, loadMw, generationMw) = fields ?? default;
        var site = sitesBy == ImportSites.Bus ? "bus-" + name : "area-" + area.ToString("0", CultureInfo.InvariantCulture);
        draft.Sites.TryAdd(site, (site, row.Line));
        var label = PlanError.Quotable(row.Words(6, 17));
        draft.Buses.Add(new Bus(name, site, label.Length == 0 ? null : label));
        buses.Add(new CdfBus(name, loadMw, generationMw));
        if (GridRules.Power.Broken(loadMw) is { } tooMuch)
            problems.Add(row.Line, 41, "load (value not shown: loads are private)", null, tooMuch);
        if (GridRules.Power.Broken(2 * generationMw) is { } broken)
            problems.Add(row.Line, 60, "twice the generation", null, broken);
    }

    private static (double Area, double LoadMw, double GenerationMw)? ByColumn(CdfRow row) => Checked(
        row.Number(19, 20), row.Number(25, 26), row.Number(28, 33), row.Number(41, 49), row.Number(60, 67));

    /// <summary>By order after the name, whose last words may reach beyond its columns.</summary>
    private static (double Area, double LoadMw, double GenerationMw)? ByOrder(CdfRow row)
    {
        const int longestOverhang = 2;
        var values = row.Values(18);
        for (var skip = 0; skip <= longestOverhang && values.Length >= skip + 8; skip++)
        {
            if (Checked(values[skip], values[skip + 2], values[skip + 3], values[skip + 5], values[skip + 7]) is { } found)
                return found;
        }

        return null;
    }

    /// <summary>The values that are kept, if the type is one and the voltage is plausible; else the row was read wrongly.</summary>
    private static (double Area, double LoadMw, double GenerationMw)? Checked(
        double area, double type, double voltage, double loadMw, double generationMw) =>
        IsCount(area) && type is 0 or 1 or 2 or 3 && voltage is > 0.3 and < 3 && double.IsFinite(loadMw) && double.IsFinite(generationMw)
            ? (area, loadMw, generationMw)
            : null;

    private static bool IsCount(double value) => value >= 0 && value < LargestNumber && value == Math.Floor(value);
}
