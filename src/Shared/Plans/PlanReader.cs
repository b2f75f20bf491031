using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>
/// Reads a plan folder and says everything that is wrong with it at once. Never throws for what a folder holds; takes
/// time and memory in proportion to the folder's size, which <see cref="PlanFileRules"/> bounds.
/// </summary>
public static class PlanReader
{
    private static readonly string[] GridFiles = [PlanFileRules.Buses, PlanFileRules.Lines, PlanFileRules.Generators];

    public static PlanReading Read(IPlanFiles files)
    {
        var problems = new PlanProblems();
        var listing = files.List();
        if (listing.Problem is { } problem || listing.Names.Count == 0)
        {
            problems.In(".").Whole(listing.Problem
                ?? "is empty: a plan folder holds plan.yaml, grid/buses.csv, grid/lines.csv, grid/generators.csv and loads/<site>.csv");
            return problems.ToReading(null);
        }

        WarnOfStrangers(listing.Names, problems);
        var settings = SettingsReader.Read(files, problems.In(PlanFileRules.Yaml));
        var grid = GridReader.Read(files, problems);
        var loads = LoadReader.Read(files, listing.Names, grid, problems);
        if (settings is not null)
            CheckLinks(settings, grid, problems.In(PlanFileRules.Yaml));
        if (problems.Count > 0 || settings is null)
            return problems.ToReading(null);
        var plan = Assemble(settings, grid, loads);
        PlanChecks.Run(plan, problems);
        return problems.ToReading(plan);
    }

    private static Plan Assemble(SettingsDraft settings, GridDraft grid, Dictionary<string, LoadSeries> loads) => new()
    {
        Name = settings.Name!,
        Interval = settings.Interval,
        Cycles = settings.Cycles,
        Scheme = settings.Scheme,
        Stop = settings.Stop,
        Privacy = settings.Privacy,
        Rounds = settings.Rounds,
        Links = settings.Links(),
        Accept = settings.Accept,
        Network = new Network(settings.BaseMva!.Value, grid.Buses, grid.Lines, grid.Generators),
        Loads = loads,
    };

    private static void CheckLinks(SettingsDraft settings, GridDraft grid, FileProblems problems)
    {
        if (!grid.BusesAreComplete)
            return;
        foreach (var (site, line, column, _) in settings.SiteLinks)
        {
            if (!grid.Sites.TryGetValue(site, out var known) || known.Name != site)
                problems.Add(line, column, "links.sites", site, $"must be a site of {PlanFileRules.Buses}"
                    + NearestName.Hint(site, grid.Sites.Values.Select(entry => entry.Name)));
        }
    }

    private static void WarnOfStrangers(IReadOnlyList<string> names, PlanProblems problems)
    {
        foreach (var name in names.Order(StringComparer.Ordinal))
        {
            if (name.StartsWith("grid/", StringComparison.Ordinal) && !GridFiles.Contains(name, StringComparer.Ordinal))
                problems.Warn(name, null, "is not read" + NearestName.Hint(name, GridFiles));
            if (name is "plan.yml" or "Plan.yaml" or "plan.yaml.txt")
                problems.Warn(name, null, "is not read: the file is called plan.yaml");
        }
    }
}
