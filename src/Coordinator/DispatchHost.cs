using System.Threading.Channels;
using Halfvoice.Coordination;
using Halfvoice.Wire;

namespace Halfvoice.Coordinator;

/// <summary>
/// Feeds the coordinator core from one queue and does what it says, in its order: store, then send. Decisions about rounds,
/// quorum and budget are the core's; this class only translates and keeps.
/// </summary>
internal sealed class DispatchHost : IDisposable
{
    private readonly CoordinatorCore _core;
    private readonly Journal _journal;
    private readonly ProgressLines _progress;
    private readonly TimeProvider _time;
    private readonly long _started;
    private readonly SiteStream?[] _seats;
    private readonly Dictionary<string, int> _index;
    private readonly ITimer _timer;
    private readonly Serilog.ILogger _log;
    private TimeSpan? _armed;
    private long _down;
    private long _up;
    private TimeSpan _nextPulse;

    public DispatchHost(CoordinatorSetup setup, CoordinatorCore core, Journal journal, ProgressLines progress, TimeProvider time, Serilog.ILogger log)
    {
        _core = core;
        _journal = journal;
        _progress = progress;
        _time = time;
        _log = log;
        _started = time.GetTimestamp();
        _seats = new SiteStream?[setup.Sites.Count];
        _index = setup.Sites.Select((site, i) => (site.Name, i)).ToDictionary(pair => pair.Name, pair => pair.i, StringComparer.Ordinal);
        _timer = time.CreateTimer(_ => Events.Writer.TryWrite(new HostEvent.Woke()), null, Timeout.InfiniteTimeSpan, Timeout.InfiniteTimeSpan);
    }

    /// <summary>The one queue. Bounded, so that a flood waits at its own stream and not in memory.</summary>
    public Channel<HostEvent> Events { get; } =
        Channel.CreateBounded<HostEvent>(new BoundedChannelOptions(8192) { SingleReader = true });

    private TimeSpan Now => _time.GetElapsedTime(_started);

    public int SiteCount => _seats.Length;

    /// <summary>Index of a site of the plan, or null.</summary>
    public int? IndexOf(string site) => _index.TryGetValue(site, out var i) ? i : null;

    /// <summary>Runs until the core says that it is finished.</summary>
    public async Task RunAsync()
    {
        _nextPulse = Now + TimeSpan.FromSeconds(WireContract.PulseSeconds);
        var finished = Do(_core.Step(new CoordinatorInput.Started(), Now));
        while (!finished)
        {
            Arm();
            var next = await Events.Reader.ReadAsync().ConfigureAwait(false);
            finished = Take(next);
        }

        foreach (var seat in _seats)
            seat?.Complete();
        Events.Writer.TryComplete();
    }

    public void Dispose() => _timer.Dispose();

    private bool Take(HostEvent next)
    {
        switch (next)
        {
            case HostEvent.Joining joining:
                return Join(joining);
            case HostEvent.Leaving leaving:
                if (_seats[leaving.Stream.Site] != leaving.Stream)
                    return false;
                Retire(leaving.Stream);
                return Do(_core.Step(new CoordinatorInput.SiteLeft(leaving.Stream.Site), Now));
            case HostEvent.Answered answered:
                return _seats[answered.Stream.Site] == answered.Stream
                    && Do(_core.Step(new CoordinatorInput.AnswerArrived(answered.Stream.Site, answered.Answer), Now));
            case HostEvent.Refused refused:
                return _seats[refused.Stream.Site] == refused.Stream
                    && Do(_core.Step(new CoordinatorInput.RefusalArrived(refused.Stream.Site, refused.Refusal), Now));
            case HostEvent.Faulty faulty:
                _journal.Store([new JournalEntry.Refused(faulty.Stream.Site, false, faulty.Refusal)], TakeBytes);
                _log.Warning("Refused a message of {Site}: {Reason}", faulty.Stream.Name, faulty.Refusal.Reason);
                faulty.Stream.TrySend(new CoordinatorMessage.Refused(faulty.Refusal));
                faulty.Stream.Complete();
                return false;
            case HostEvent.Woke:
                _armed = null;
                Pulse();
                return Do(_core.Step(new CoordinatorInput.Woke(), Now));
            case HostEvent.Stop:
                return Do(_core.Step(new CoordinatorInput.StopAsked(), Now));
            default:
                throw new ArgumentOutOfRangeException(nameof(next));
        }
    }

    private bool Join(HostEvent.Joining joining)
    {
        var stream = joining.Stream;
        var taken = _seats[stream.Site] is not null;
        if (!taken)
            _seats[stream.Site] = stream;
        var step = _core.Step(new CoordinatorInput.SiteJoined(stream.Site, joining.Enrol), Now);
        var welcomed = step.Send.Any(pair => pair.Site == stream.Site && pair.Message is CoordinatorMessage.Welcomed);
        if (welcomed)
            return Do(step);

        // Refused: the 'no' belongs to the new stream, never to one that sits in the seat already.
        _journal.Store(step.Store, TakeBytes);
        foreach (var (_, message) in step.Send)
            stream.TrySend(message);
        stream.Complete();
        if (!taken)
            _seats[stream.Site] = null;
        return false;
    }

    private bool Do(CoordinatorStep step)
    {
        _journal.Store(step.Store, TakeBytes);
        foreach (var (site, message) in step.Send)
        {
            if (_seats[site] is { } stream && !stream.TrySend(message))
                stream.Complete();
        }

        foreach (var news in step.News)
            _progress.Tell(news, Now);
        return step.Finished;
    }

    private void Retire(SiteStream stream)
    {
        _seats[stream.Site] = null;
        _down += stream.BytesDown;
        _up += stream.BytesUp;
        stream.Complete();
    }

    /// <summary>Bytes on the wire since this was last asked.</summary>
    private (long Down, long Up) TakeBytes()
    {
        long down = _down, up = _up;
        foreach (var seat in _seats)
        {
            down += seat?.BytesDown ?? 0;
            up += seat?.BytesUp ?? 0;
        }

        var result = (down - _takenDown, up - _takenUp);
        (_takenDown, _takenUp) = (down, up);
        return result;
    }

    private long _takenDown;
    private long _takenUp;

    private void Pulse()
    {
        if (Now < _nextPulse)
            return;
        _nextPulse = Now + TimeSpan.FromSeconds(WireContract.PulseSeconds);
        foreach (var seat in _seats)
        {
            if (seat is not null && !seat.TrySendPulse())
                seat.Complete();
        }
    }

    /// <summary>Sets the one timer to the earlier of the core's wake-up and the next pulse.</summary>
    private void Arm()
    {
        var at = _core.WakeAt is { } wake && wake < _nextPulse ? wake : _nextPulse;
        if (_armed == at)
            return;
        _armed = at;
        var wait = at - Now;
        _timer.Change(wait > TimeSpan.Zero ? wait + TimeSpan.FromMilliseconds(1) : TimeSpan.Zero, Timeout.InfiniteTimeSpan);
    }
}
