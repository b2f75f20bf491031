namespace Halfvoice.Plans;

/// <summary>All snapshots of one load file.</summary>
internal sealed class SnapshotList(int buses)
{
    private readonly List<Snapshot> _all = [];
    private readonly Dictionary<string, Snapshot> _byLabel = new(StringComparer.Ordinal);

    /// <summary>False where one more snapshot would take more memory than a load file may.</summary>
    public bool HasRoom => (_all.Count + 1L) * buses <= PlanFileRules.MaxLoadRows * 4L;

    public Snapshot? Last => _all.Count == 0 ? null : _all[^1];

    public Snapshot? Find(string label) => _byLabel.GetValueOrDefault(label);

    public Snapshot Start(string label, LoadTime time, int line)
    {
        var snapshot = new Snapshot(label, time, line, buses);
        _all.Add(snapshot);
        _byLabel.Add(label, snapshot);
        return snapshot;
    }

    /// <summary>The one snapshot of a file without times.</summary>
    public Snapshot Only(int line) => Last ?? Start("", default, line);

    /// <summary>Every snapshot lists the same buses: a forgotten row would otherwise read as a load of zero.</summary>
    public void CheckSameBuses(FileProblems problems, string[] names)
    {
        foreach (var snapshot in _all)
        {
            for (var bus = 0; bus < buses; bus++)
            {
                if (snapshot.Gives(bus) == _all[0].Gives(bus) || problems.IsFull)
                    continue;
                var name = PlanError.Quotable(names[bus]);
                var difference = _all[0].Gives(bus)
                    ? $"without bus '{name}', which the first snapshot has"
                    : $"with bus '{name}', which the first snapshot has not";
                problems.Add(snapshot.Line, null, null, null, $"starts a snapshot {difference}: every snapshot lists the same buses");
            }
        }
    }

    public LoadSeries ToSeries()
    {
        if (_all.Count == 0)
            return new LoadSeries([], [new double[buses]]);
        var timed = _all[0].Label.Length > 0;
        return new LoadSeries(timed ? [.. _all.Select(snapshot => snapshot.Label)] : [], [.. _all.Select(snapshot => snapshot.LoadMw)]);
    }
}
