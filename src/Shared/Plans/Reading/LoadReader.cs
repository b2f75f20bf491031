namespace Halfvoice.Plans;

/// <summary>
/// Reads the folder <c>loads</c>. Its values are private to the sites: no message made here holds one, not even where a
/// value stands in a wrong column.
/// </summary>
internal static class LoadReader
{
    private static readonly CsvColumn[] Columns = [new("bus"), new("load_mw"), new("time", false)];

    private const int BusColumn = 0, LoadColumn = 1, TimeColumn = 2;

    /// <summary>Loads by site; sites without a file have zeros.</summary>
    public static Dictionary<string, LoadSeries> Read(IPlanFiles files, IEnumerable<string> names, GridDraft draft, PlanProblems problems)
    {
        var loads = new Dictionary<string, LoadSeries>(StringComparer.Ordinal);
        var busesOf = draft.Buses.Select((bus, index) => (bus.Site, index))
            .ToLookup(pair => pair.Site, pair => pair.index, StringComparer.Ordinal);
        var fileOf = new Dictionary<string, string>(StringComparer.OrdinalIgnoreCase);
        (string File, LoadSeries Series)? timed = null;
        var own = names.Where(name => name.StartsWith(PlanFileRules.LoadFolder, StringComparison.Ordinal));
        foreach (var name in own.Order(StringComparer.Ordinal))
        {
            if (problems.IsFull)
                break;
            var inFile = problems.In(name);
            if (SiteOf(name, draft, fileOf, inFile) is not { } site)
                continue;
            var series = ReadFile(files, inFile, [.. busesOf[site]], draft);
            if (series is null || inFile.Count > 0)
                continue;
            loads[site] = series;
            if (series.Times.Count == 0)
                continue;
            timed ??= (name, series);
            if (!series.Times.SequenceEqual(timed.Value.Series.Times, StringComparer.Ordinal))
                inFile.Whole($"does not have the same times as {timed.Value.File}: all sites with times need the same ones");
        }

        foreach (var site in draft.Sites.Values)
            loads.TryAdd(site.Name, new LoadSeries([], [new double[busesOf[site.Name].Count()]]));
        return loads;
    }

    private static string? SiteOf(string name, GridDraft draft, Dictionary<string, string> fileOf, FileProblems problems)
    {
        var leaf = name[PlanFileRules.LoadFolder.Length..];
        if (!leaf.EndsWith(".csv", StringComparison.Ordinal))
        {
            problems.Warn(null, "is not read: load files end in .csv");
            return null;
        }

        var site = leaf[..^".csv".Length];
        if (!fileOf.TryAdd(site, name))
        {
            problems.Whole($"and {fileOf[site]} name the same site: a site has one load file");
            return null;
        }

        if (!draft.Sites.TryGetValue(site, out var known))
        {
            if (draft.BusesAreComplete)
                problems.Whole($"belongs to no site of {PlanFileRules.Buses}"
                    + NearestName.Hint(site, draft.Sites.Values.Select(entry => entry.Name)));
            return null;
        }

        if (known.Name == site)
            return site;
        problems.Whole($"names site '{known.Name}' in another case: call it {PlanFileRules.LoadFile(known.Name)}");
        return null;
    }

    private static LoadSeries? ReadFile(IPlanFiles files, FileProblems problems, int[] buses, GridDraft draft)
    {
        if (CsvSheet.Open(files, problems, Columns, PlanFileRules.MaxLoadRows) is not { } sheet)
            return null;
        var position = new Dictionary<int, int>();
        for (var i = 0; i < buses.Length; i++)
            position[buses[i]] = i;
        var snapshots = new SnapshotList(buses.Length);
        while (sheet.Next())
        {
            if (sheet.RowIsBroken)
                continue;
            var snapshot = sheet.Has(TimeColumn) ? SnapshotOf(sheet, snapshots) : snapshots.Only(sheet.Line);
            var own = OwnBus(sheet, draft, position);
            var load = sheet.Number(LoadColumn, GridRules.Power);
            if (snapshot is null || own is not { } bus || load is not { } loadMw)
                continue;
            if (!snapshot.Put(bus, loadMw))
                sheet.Reject(BusColumn, sheet.Has(TimeColumn) ? "is there twice at the same time" : "is there twice");
        }

        if (problems.Count > 0)
            return null;
        snapshots.CheckSameBuses(problems, [.. buses.Select(bus => draft.Buses[bus].Name)]);
        return snapshots.ToSeries();
    }

    private static Snapshot? SnapshotOf(CsvSheet sheet, SnapshotList snapshots)
    {
        var label = sheet.Text(TimeColumn);
        if (snapshots.Find(label) is { } known)
            return known;
        if (!LoadTime.TryRead(label, out var time))
            sheet.Reject(TimeColumn, "must be a time such as 08:05, 2031-04-02T08:05 or 2031-04-02T08:05:00Z");
        else if (snapshots.Last is { } last && last.Time.Kind != time.Kind)
            sheet.Reject(TimeColumn, "must be written in the same way as the times before it");
        else if (snapshots.Last is { } before && before.Time.Instant >= time.Instant)
            sheet.Reject(TimeColumn, $"must be later than the time that starts in line {before.Line}: snapshots come in order");
        else if (!snapshots.HasRoom)
            sheet.Reject(TimeColumn, "starts one snapshot too many: a load file has room for 4,000,000 buses times snapshots");
        else
            return snapshots.Start(label, time, sheet.Line);
        return null;
    }

    private static int? OwnBus(CsvSheet sheet, GridDraft draft, Dictionary<int, int> position)
    {
        var name = sheet.Text(BusColumn);
        if (!draft.BusAt.TryGetValue(name, out var found))
        {
            if (draft.BusesAreComplete)
                sheet.Reject(BusColumn, name.Length == 0
                    ? "must not be blank: it needs the name of a bus"
                    : "must be a bus of grid/buses.csv");
            return null;
        }

        if (found.Index < 0)
            return null;
        if (position.TryGetValue(found.Index, out var own))
            return own;
        sheet.Reject(BusColumn, "must be a bus of this site: in grid/buses.csv it belongs to another one");
        return null;
    }
}
