using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>Reads the three files of the folder <c>grid</c>.</summary>
internal static class GridReader
{
    private static readonly CsvColumn[] BusColumns = [new("bus"), new("site"), new("name", false), new("x", false), new("y", false)];

    private static readonly CsvColumn[] LineColumns =
    [
        new("line"), new("from_bus"), new("to_bus"), new("reactance_pu"), new("limit_mw"),
        new("resistance_pu", false), new("emergency_limit_mw", false),
    ];

    private static readonly CsvColumn[] GeneratorColumns =
    [
        new("generator"), new("bus"), new("min_mw"), new("max_mw"), new("cost_quadratic"), new("cost_linear"), new("cost_fixed"),
    ];

    public static GridDraft Read(IPlanFiles files, PlanProblems problems)
    {
        var draft = new GridDraft();
        ReadBuses(files, problems.In(PlanFileRules.Buses), draft);
        ReadLines(files, problems.In(PlanFileRules.Lines), draft);
        ReadGenerators(files, problems.In(PlanFileRules.Generators), draft);
        return draft;
    }

    /// <summary>Reads generators alone, for an import that brings its own buses.</summary>
    public static void ReadGenerators(IPlanFiles files, FileProblems problems, GridDraft draft)
    {
        const int name = 0, bus = 1, least = 2, most = 3, quadratic = 4, linear = 5, constant = 6;
        if (CsvSheet.Open(files, problems, GeneratorColumns, PlanFileRules.MaxGenerators) is not { } sheet)
            return;
        var seen = new Dictionary<string, int>(StringComparer.Ordinal);
        while (sheet.Next())
        {
            if (sheet.RowIsBroken)
                continue;
            Unique(sheet, name, seen);
            var at = BusOf(sheet, bus, draft);
            var minMw = sheet.Number(least, GridRules.Power);
            var maxMw = sheet.Number(most, GridRules.Power);
            var a = sheet.Number(quadratic, GridRules.CostQuadratic);
            var b = sheet.Number(linear, GridRules.CostLinear);
            var c = sheet.Number(constant, GridRules.CostFixed);
            if (a < 0)
                continue;
            if (minMw > maxMw)
                sheet.Reject(least, $"must not be above max_mw, which is '{PlanError.Quotable(sheet.Text(most))}'");
            else if (at is { } index && minMw is { } min && maxMw is { } max && a is { } square && b is { } slope && c is { } offset)
                draft.Generators.Add(new Generator(sheet.Text(name), index, min, max, square, slope, offset));
        }
    }

    private static void ReadBuses(IPlanFiles files, FileProblems problems, GridDraft draft)
    {
        const int name = 0, site = 1, label = 2, x = 3, y = 4;
        if (CsvSheet.Open(files, problems, BusColumns, PlanFileRules.MaxBuses) is not { } sheet)
            return;
        while (sheet.Next())
        {
            var bus = sheet.Text(name);
            if (sheet.RowIsBroken)
            {
                // The name most likely stands where it should: keep it, so that nothing else complains of a missing bus.
                if (bus.Length > 0)
                    draft.BusAt.TryAdd(bus, (-1, sheet.Line));
                continue;
            }

            var owner = sheet.Text(site);
            if (GridRules.BrokenName(bus) is { } broken)
                sheet.Reject(name, broken);
            else if (!draft.BusAt.TryAdd(bus, (draft.Buses.Count, sheet.Line)))
                sheet.Reject(name, TwiceRule(draft, bus, owner));
            if (GridRules.BrokenSite(owner) is { } unsafeName)
                sheet.Reject(site, unsafeName);
            else if (!draft.Sites.TryAdd(owner, (owner, sheet.Line)) && draft.Sites[owner] is var first && first.Name != owner)
                sheet.Reject(site, $"differs only in case from site '{first.Name}' in line {first.Line}: use one spelling");
            var text = sheet.Text(label);
            draft.Buses.Add(new Bus(
                bus,
                owner,
                text.Length == 0 ? null : text,
                sheet.OptionalNumber(x, GridRules.Coordinate),
                sheet.OptionalNumber(y, GridRules.Coordinate)));
        }

        draft.BusesAreComplete = !problems.IsFull;
        if (draft.BusAt.Count == 0 && problems.Count == 0)
            problems.Whole("has no bus: a plan needs at least one");
    }

    private static string TwiceRule(GridDraft draft, string bus, string site)
    {
        var (index, line) = draft.BusAt[bus];
        var other = index >= 0 && index < draft.Buses.Count ? draft.Buses[index].Site : site;
        return other == site
            ? $"is there twice, first in line {line}: a bus is listed once"
            : $"is given to site '{PlanError.Quotable(site)}' here and to site '{PlanError.Quotable(other)}' in line {line}: "
            + "a bus has one site";
    }

    private static void ReadLines(IPlanFiles files, FileProblems problems, GridDraft draft)
    {
        const int name = 0, from = 1, to = 2, reactance = 3, limit = 4, resistance = 5, emergency = 6;
        if (CsvSheet.Open(files, problems, LineColumns, PlanFileRules.MaxLines) is not { } sheet)
            return;
        var seen = new Dictionary<string, int>(StringComparer.Ordinal);
        while (sheet.Next())
        {
            if (sheet.RowIsBroken)
                continue;
            Unique(sheet, name, seen);
            var start = BusOf(sheet, from, draft);
            var end = BusOf(sheet, to, draft);
            if (sheet.Text(from).Length > 0 && sheet.Text(from) == sheet.Text(to))
                sheet.Reject(to, "must not be the bus that the line starts from: a line joins two buses");
            var pu = sheet.Number(reactance, GridRules.Reactance);
            if (pu is { } value && GridRules.BrokenReactance(value) is { } broken)
                sheet.Reject(reactance, broken);
            var limitMw = LimitOf(sheet, limit);
            var resistancePu = sheet.OptionalNumber(resistance, GridRules.Resistance);
            var emergencyMw = LimitOf(sheet, emergency);
            if (emergencyMw < limitMw)
                sheet.Reject(emergency, "must not be below limit_mw: it is the higher, short-term limit");
            if (start is { } a && end is { } b && a != b && pu is { } x && x != 0)
                draft.Lines.Add(new Line(sheet.Text(name), a, b, x, limitMw ?? double.PositiveInfinity, resistancePu, emergencyMw));
        }
    }

    private static double? LimitOf(CsvSheet sheet, int column)
    {
        var text = sheet.Text(column);
        if (text.Length == 0)
            return null;
        if (Quantity.TryNumber(text, out var value) && (value == 0 || double.IsPositiveInfinity(value)))
        {
            sheet.Reject(column, value == 0
                ? "must be above 0 MW: leave it empty for no limit, or take the line out"
                : "must be finite: leave it empty for no limit");
            return null;
        }

        return sheet.Number(column, GridRules.Limit);
    }

    private static void Unique(CsvSheet sheet, int column, Dictionary<string, int> seen)
    {
        var name = sheet.Text(column);
        if (GridRules.BrokenName(name) is { } broken)
            sheet.Reject(column, broken);
        else if (!seen.TryAdd(name, sheet.Line))
            sheet.Reject(column, $"is there twice, first in line {seen[name]}: names are unique");
    }

    private static int? BusOf(CsvSheet sheet, int column, GridDraft draft)
    {
        var name = sheet.Text(column);
        if (name.Length == 0)
        {
            sheet.Reject(column, "must not be blank: it needs the name of a bus");
            return null;
        }

        if (draft.BusAt.TryGetValue(name, out var found))
            return found.Index < 0 ? null : found.Index;
        if (draft.BusesAreComplete)
            sheet.Reject(column, $"must be a bus of {draft.BusSource}" + NearestName.Hint(name, draft.BusAt.Keys));
        return null;
    }
}
