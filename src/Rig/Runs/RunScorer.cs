using Halfvoice.Coordination;
using Halfvoice.Optimization;
using Halfvoice.Plans;
using Halfvoice.Rehearsal;

namespace Halfvoice.Rig.Runs;

/// <summary>Scores a finished run from its files: what the coordinator journalled, what the sites kept, and the true loads.</summary>
public sealed class RunScorer
{
    private readonly Plan _plan;
    private readonly SetupBuilder _setups;
    private readonly RunFolder _folder;
    private readonly IReadOnlyList<Optimum> _optima;

    public RunScorer(Plan plan, SetupBuilder setups, RunFolder folder, IReadOnlyList<Optimum> optima)
    {
        _plan = plan;
        _setups = setups;
        _folder = folder;
        _optima = optima;
    }

    /// <summary>Writes record.sqlite and truth.sqlite, and judges the run.</summary>
    /// <exception cref="RigException">The run left no usable journal.</exception>
    public Verdict Judge(IReadOnlyDictionary<string, string> options, string binaries)
    {
        using var journal = new JournalReader(Path.Combine(_folder.CoordinatorState, "journal.sqlite"));
        var cycles = journal.Cycles();
        if (cycles.Count == 0)
            throw new RigException(ExitCodes.Broke, $"The run ended without one finished cycle. See {_folder.Logs}.");
        RecordWriter.Write(_folder.Record, _plan, _setups.Coordinator, journal);
        var (setPoints, epsilon) = ReadSites();
        using var truth = new TruthWriter(_folder.Truth, _plan);
        var results = cycles.Select(cycle => Score(cycle, setPoints, epsilon, truth)).ToArray();
        var limits = AcceptanceJudge.Judge(_plan, results);
        return new Verdict
        {
            Passed = limits.All(limit => limit.Passed) && results.Length == _plan.Cycles,
            Plan = _plan.Name,
            Limits = limits,
            Cycles = results,
            Commit = BuildStamp.Commit,
            Options = options,
            Notes = RunNotes.Of(_plan, cycles, binaries),
        };
    }

    private (Dictionary<(int Cycle, string Generator), double> SetPoints, Dictionary<(int Cycle, string Site), double> Epsilon) ReadSites()
    {
        var setPoints = new Dictionary<(int, string), double>();
        var epsilon = new Dictionary<(int, string), double>();
        foreach (var site in _plan.Network.Sites)
        {
            var path = Path.Combine(_folder.SiteState(site), "ledger.sqlite");
            if (!File.Exists(path))
                continue;
            var (points, spent) = SiteLedgerReader.Read(path);
            foreach (var (cycle, generator, mw, _) in points)
                setPoints[(cycle, generator)] = mw;
            foreach (var (cycle, units) in spent)
                epsilon[(cycle, site)] = units;
        }

        return (setPoints, epsilon);
    }

    private CycleResult Score(
        JournalCycle cycle, Dictionary<(int Cycle, string Generator), double> setPoints,
        Dictionary<(int Cycle, string Site), double> epsilon, TruthWriter truth)
    {
        var load = _plan.LoadMw(cycle.Cycle);
        var optimum = _optima[cycle.Cycle - 1];
        var generators = _plan.Network.Generators;
        var complete = generators.All(g => setPoints.ContainsKey((cycle.Cycle, g.Name)));
        var points = complete ? generators.Select(g => setPoints[(cycle.Cycle, g.Name)]).ToArray() : null;
        var score = points is null ? null : DeliveredDispatch.Score(_plan.Network, load, points, optimum.CostPerHour);
        truth.Add(cycle.Cycle, load, optimum, points, score);
        return new CycleResult
        {
            Cycle = cycle.Cycle,
            Settled = cycle.End == nameof(CycleEnd.Settled),
            End = cycle.End,
            Rounds = cycle.Rounds,
            Seconds = cycle.Seconds,
            OptimumPerHour = optimum.CostPerHour,
            CostPerHour = score?.CostPerHour,
            CostGap = score?.CostGap,
            ReserveMw = score is null ? null : score.ReserveMw + score.UnbalancedMw,
            WorstLoading = score?.WorstLoading,
            WorstLine = score?.WorstLine is { } line ? _plan.Network.Lines[line].Name : null,
            Bytes = cycle.BytesDown + cycle.BytesUp,
            EpsilonBySite = _plan.Privacy.Mechanism == MechanismKind.None
                ? new Dictionary<string, double>()
                : _plan.Network.Sites.ToDictionary(site => site, site => epsilon.GetValueOrDefault((cycle.Cycle, site))),
        };
    }
}
