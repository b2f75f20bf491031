using Halfvoice.Plans;
using Halfvoice.Privacy;

namespace Halfvoice.Coordination;

/// <summary>
/// All cores of a plan in one place, wired together without a network: the same decisions as in the field, at the speed of
/// the processor and with a clock that stands still between deadlines. For checks and tests; nothing here is durable.
/// </summary>
public sealed class LocalDispatch
{
    private readonly CoordinatorCore _coordinator;
    private readonly SiteCore[] _sites;
    private readonly Queue<(int Site, CoordinatorMessage Message)> _queue = new();
    private readonly List<SetPoint>[] _setPoints;
    private readonly Dictionary<string, int> _generatorIndex;
    private readonly Plan _plan;
    private TimeSpan _now;
    private bool _finished;

    /// <param name="plan">A validated plan.</param>
    /// <param name="setups">Its setups.</param>
    /// <param name="noise">Gives each site its noise source.</param>
    public LocalDispatch(Plan plan, SetupBuilder setups, Func<string, INoiseSource> noise)
    {
        _plan = plan;
        _coordinator = new CoordinatorCore(setups.Coordinator);
        _sites = plan.Network.Sites
            .Select(site => new SiteCore(setups.ForSite(site), new Readings(plan.Loads[site]), noise(site), [], out _))
            .ToArray();
        _setPoints = Array.ConvertAll(_sites, _ => new List<SetPoint>());
        _generatorIndex = plan.Network.Generators.Select((g, i) => (g.Name, i)).ToDictionary(pair => pair.Name, pair => pair.i, StringComparer.Ordinal);
    }

    /// <summary>Called with every journal entry, in order.</summary>
    public event Action<JournalEntry>? Journalled;

    /// <summary>Runs all cycles of the plan.</summary>
    /// <returns>One entry a cycle.</returns>
    public IReadOnlyList<LocalCycle> Run()
    {
        var cycles = new List<LocalCycle>();
        Take(new CoordinatorInput.Started(), cycles);
        for (var s = 0; s < _sites.Length; s++)
            Take(new CoordinatorInput.SiteJoined(s, _sites[s].Enrolment()), cycles);
        while (!_finished)
        {
            if (_queue.TryDequeue(out var next))
            {
                Deliver(next.Site, next.Message, cycles);
            }
            else
            {
                _now = _coordinator.WakeAt ?? throw new InvalidOperationException("Nothing is under way and nothing will wake.");
                Take(new CoordinatorInput.Woke(), cycles);
            }
        }

        while (_queue.TryDequeue(out var rest))
            Deliver(rest.Site, rest.Message, cycles);
        return cycles;
    }

    /// <summary>Set-points of a cycle, MW, in the order of the plan's generators.</summary>
    public double[] SetPointsMw(int cycle)
    {
        var mw = new double[_generatorIndex.Count];
        foreach (var point in _setPoints.SelectMany(list => list).Where(point => point.Cycle == cycle))
            mw[_generatorIndex[point.Generator]] = point.Mw;
        return mw;
    }

    private void Deliver(int site, CoordinatorMessage message, List<LocalCycle> cycles)
    {
        SiteInput? input = message switch
        {
            CoordinatorMessage.Welcomed welcomed => new SiteInput.Welcomed(welcomed.Welcome),
            CoordinatorMessage.Asked asked => new SiteInput.Asked(asked.Ask),
            CoordinatorMessage.Ended ended => new SiteInput.Ended(ended.Outcome),
            _ => null,
        };
        if (input is null)
            return;
        var step = _sites[site].Step(input, _now);
        _setPoints[site].AddRange(step.SetPoints);
        var reply = step.Reply;
        _sites[site].PrepareNoise();
        switch (reply)
        {
            case SiteReply.Answered answered:
                Take(new CoordinatorInput.AnswerArrived(site, answered.Answer), cycles);
                break;
            case SiteReply.Refused refused:
                Take(new CoordinatorInput.RefusalArrived(site, refused.Refusal), cycles);
                break;
            default:
                break;
        }
    }

    private void Take(CoordinatorInput input, List<LocalCycle> cycles)
    {
        var step = _coordinator.Step(input, _now);
        foreach (var entry in step.Store)
        {
            Journalled?.Invoke(entry);
            if (entry is JournalEntry.CycleClosed closed)
                cycles.Add(new LocalCycle(closed.Cycle, closed.End, closed.Rounds, closed.Measure, closed.UnservedMw));
        }

        foreach (var send in step.Send)
            _queue.Enqueue(send);
        _finished |= step.Finished;
    }

    private sealed class Readings : ILoadReadings
    {
        private readonly LoadSeries _series;

        public Readings(LoadSeries series) => _series = series;

        public bool TryRead(int cycle, Span<double> loadMw)
        {
            _series.At(cycle).CopyTo(loadMw);
            return true;
        }
    }
}

/// <summary>How a cycle of a <see cref="LocalDispatch"/> ended.</summary>
public sealed record LocalCycle(int Cycle, CycleEnd End, int Rounds, RoundMeasure Measure, double UnservedMw);
