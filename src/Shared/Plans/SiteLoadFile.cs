using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>One site's load file on its own, as an agent has it: the same form and the same rules as in a plan folder.</summary>
public static class SiteLoadFile
{
    private const string Site = "site";

    /// <param name="bytes">The file.</param>
    /// <param name="buses">Names of the site's buses; the series comes in this order.</param>
    /// <returns>The series, or everything that is wrong with the file; no error quotes a load.</returns>
    public static (LoadSeries? Series, IReadOnlyList<PlanError> Errors) Read(byte[] bytes, IReadOnlyList<string> buses)
    {
        var name = PlanFileRules.LoadFile(Site);
        var draft = new GridDraft { BusesAreComplete = true };
        for (var i = 0; i < buses.Count; i++)
        {
            draft.Buses.Add(new Bus(buses[i], Site));
            draft.BusAt[buses[i]] = (i, 0);
        }

        draft.Sites[Site] = (Site, 0);
        var problems = new PlanProblems();
        var files = new MemoryPlanFiles(new Dictionary<string, byte[]>(StringComparer.Ordinal) { [name] = bytes });
        var loads = LoadReader.Read(files, [name], draft, problems);
        return problems.Count > 0 ? (null, problems.ToReading(null).Errors) : (loads[Site], []);
    }
}
