using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>How rough an exchange is; all of it is drawn from one seed.</summary>
/// <param name="Drop">Probability that a message vanishes.</param>
/// <param name="Duplicate">Probability that it comes twice.</param>
/// <param name="SlowestSeconds">Delays are uniform from 1 ms to this.</param>
/// <param name="SiteCrash">Probability that a site dies at a step, with what it had stored.</param>
/// <param name="CoordinatorCrash">Probability that the coordinator dies at a step, with what it had journalled.</param>
internal sealed record Roughness(double Drop, double Duplicate, double SlowestSeconds, double SiteCrash, double CoordinatorCrash);

/// <summary>
/// Both cores under a seeded clock and a network that loses, delays and repeats messages, and kills either end: before it has
/// stored what a step says, between storing and sending, or after. Invariants are checked at every step.
/// </summary>
internal sealed class LossyExchange
{
    private const int StepLimit = 400_000;

    private readonly Plan _plan;
    private readonly Roughness _rough;
    private readonly Random _random;
    private readonly PriorityQueue<Action, (long Ticks, long Order)> _events = new();
    private readonly LossySite[] _sites;
    private readonly SetupBuilder _setups;
    private readonly LossyJournal _journal;
    private CoordinatorCore _coordinator;
    private int _epoch;
    private long _order;
    private TimeSpan _now;
    private bool _finished;

    public LossyExchange(Plan plan, int seed, Roughness rough)
    {
        _plan = plan;
        _rough = rough;
        _random = new Random(seed);
        _setups = new SetupBuilder(plan);
        _journal = new LossyJournal(_setups.Coordinator);
        _coordinator = new CoordinatorCore(_setups.Coordinator);
        _sites = plan.Network.Sites.Select((site, s) => new LossySite(_setups.ForSite(site), plan.Loads[site], (ulong)((1000 * seed) + s))).ToArray();
    }

    public LossyJournal Journal => _journal;

    public IReadOnlyList<LossySite> Sites => _sites;

    public int SiteCrashes { get; private set; }

    public int CoordinatorCrashes { get; private set; }

    /// <summary>Runs to the farewell.</summary>
    public void Run()
    {
        StepCoordinator(new CoordinatorInput.Started());
        for (var s = 0; s < _sites.Length; s++)
            Connect(s);
        for (var step = 0; !_finished; step++)
        {
            Assert.True(step < StepLimit, "The exchange does not come to an end.");
            Assert.True(_events.TryDequeue(out var happen, out var at), "Nothing is under way, yet the run is not finished.");
            _now = new TimeSpan(at.Ticks);
            happen();
        }
    }

    private void At(double seconds, Action happen) => _events.Enqueue(happen, ((_now + TimeSpan.FromSeconds(seconds)).Ticks, _order++));

    private double Delay() => 0.001 + (_random.NextDouble() * _rough.SlowestSeconds);

    private bool Chance(double probability) => _random.NextDouble() < probability;

    /// <summary>A stream opens: the enrolment arrives, with the coordinator that is alive then.</summary>
    private void Connect(int site)
    {
        var stream = ++_sites[site].Stream;
        At(Delay(), () =>
        {
            if (_sites[site].Stream == stream)
                StepCoordinator(new CoordinatorInput.SiteJoined(site, _sites[site].Core.Enrolment()));
        });
    }

    /// <summary>Sends a message over a stream; what is under way when the stream breaks is lost.</summary>
    private void Carry(int site, Action deliver)
    {
        var (stream, epoch) = (_sites[site].Stream, _epoch);
        var copies = Chance(_rough.Drop) ? 0 : Chance(_rough.Duplicate) ? 2 : 1;
        for (var i = 0; i < copies; i++)
        {
            At(Delay(), () =>
            {
                if (_sites[site].Stream == stream && _epoch == epoch)
                    deliver();
            });
        }
    }

    private void StepCoordinator(CoordinatorInput input)
    {
        if (_finished)
            return;
        var step = _coordinator.Step(input, _now);
        var crash = Chance(_rough.CoordinatorCrash) ? _random.Next(2) : -1;
        if (crash == 0)
        {
            RestartCoordinator();
            return;
        }

        foreach (var entry in step.Store)
            _journal.Store(entry);
        if (crash == 1)
        {
            RestartCoordinator();
            return;
        }

        foreach (var (site, message) in step.Send.ToArray())
            Carry(site, () => StepSite(site, message));
        _finished = step.Finished;
        ScheduleWake();
    }

    private void ScheduleWake()
    {
        if (_coordinator.WakeAt is not { } at)
            return;
        var epoch = _epoch;
        At(Math.Max(0, (at - _now).TotalSeconds), () =>
        {
            if (_epoch == epoch && _coordinator.WakeAt is { } due && due <= _now)
                StepCoordinator(new CoordinatorInput.Woke());
        });
    }

    private void RestartCoordinator()
    {
        CoordinatorCrashes++;
        _epoch++;
        _coordinator = new CoordinatorCore(_setups.Coordinator);
        if (_journal.Last is { } last)
            _coordinator.Resume(last.Id, last.CycleClosed, last.State);
        StepCoordinator(new CoordinatorInput.Started());
        for (var s = 0; s < _sites.Length; s++)
            Connect(s);
    }

    private void StepSite(int site, CoordinatorMessage message)
    {
        SiteInput? input = message switch
        {
            CoordinatorMessage.Asked asked => new SiteInput.Asked(asked.Ask),
            CoordinatorMessage.Ended ended => new SiteInput.Ended(ended.Outcome),
            CoordinatorMessage.Welcomed welcomed => new SiteInput.Welcomed(welcomed.Welcome),
            _ => null,
        };
        if (input is null)
            return;
        var crash = Chance(_rough.SiteCrash) ? _random.Next(2) : -1;
        var reply = _sites[site].Step(input, storesFirst: crash != 0, sends: crash < 0);
        if (crash >= 0)
            RestartSite(site);
        else if (reply is SiteReply.Answered answered)
            Carry(site, () => StepCoordinator(new CoordinatorInput.AnswerArrived(site, answered.Answer)));
        else if (reply is SiteReply.Refused refused)
            Carry(site, () => StepCoordinator(new CoordinatorInput.RefusalArrived(site, refused.Refusal)));
    }

    private void RestartSite(int site)
    {
        SiteCrashes++;
        _sites[site].Restart();
        _sites[site].Stream++;
        var epoch = _epoch;
        At(Delay(), () =>
        {
            if (_epoch == epoch)
                StepCoordinator(new CoordinatorInput.SiteLeft(site));
            Connect(site);
        });
    }
}
