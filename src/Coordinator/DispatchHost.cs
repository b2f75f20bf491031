using Halfvoice.Coordination;
using Halfvoice.Wire;

namespace Halfvoice.Coordinator;

/// <summary>
/// Feeds the coordinator core, one input at a time under one lock, and does what it says in its order: store, then send.
/// Inputs come straight from the threads that read the streams, so that an answer needs no queue between them and the core.
/// What is to be sent is put in order under the lock and written after it.
/// Decisions about rounds, quorum and budget are the core's; this class only translates and keeps.
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
    private readonly Lock _gate = new();
    private readonly List<SiteStream> _toFlush = [];
    private readonly TaskCompletionSource _done = new(TaskCreationOptions.RunContinuationsAsynchronously);
    private TimeSpan? _armed;
    private TimeSpan _nextPulse;
    private long _down;
    private long _up;
    private long _takenDown;
    private long _takenUp;
    private bool _finished;

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
        _timer = time.CreateTimer(_ => Wake(), null, Timeout.InfiniteTimeSpan, Timeout.InfiniteTimeSpan);
    }

    public int SiteCount => _seats.Length;

    /// <summary>Completes when the core is finished and all farewells are under way; faults when the journal cannot be kept.</summary>
    public Task Done => _done.Task;

    private TimeSpan Now => _time.GetElapsedTime(_started);

    /// <summary>Index of a site of the plan, or null.</summary>
    public int? IndexOf(string site) => _index.TryGetValue(site, out var i) ? i : null;

    /// <summary>Lets sites join from now on.</summary>
    public void Start() => Guard(() =>
    {
        _nextPulse = Now + TimeSpan.FromSeconds(WireContract.PulseSeconds);
        Do(_core.Step(new CoordinatorInput.Started(), Now));
    });

    /// <summary>A stream with a proven identity and a readable enrolment asks for its seat.</summary>
    public void Join(SiteStream stream, Enrol enrol) => Guard(() =>
    {
        var taken = _seats[stream.Site] is not null;
        if (!taken)
            _seats[stream.Site] = stream;
        var step = _core.Step(new CoordinatorInput.SiteJoined(stream.Site, enrol), Now);
        if (step.Send.Any(pair => pair.Site == stream.Site && pair.Message is CoordinatorMessage.Welcomed))
        {
            Do(step);
            return;
        }

        // Refused: the 'no' belongs to the new stream, never to one that sits in the seat already.
        _journal.Store(step.Store, TakeBytes);
        foreach (var (_, message) in step.Send)
            Send(stream, message);
        stream.Complete();
        if (!taken)
            _seats[stream.Site] = null;
    });

    public void Leave(SiteStream stream) => Guard(() =>
    {
        stream.Complete();
        if (_seats[stream.Site] != stream)
            return;
        _seats[stream.Site] = null;
        _down += stream.BytesDown;
        _up += stream.BytesUp;
        Do(_core.Step(new CoordinatorInput.SiteLeft(stream.Site), Now));
    });

    public void Answer(SiteStream stream, Answer answer) => Guard(() =>
    {
        if (_seats[stream.Site] == stream)
            Do(_core.Step(new CoordinatorInput.AnswerArrived(stream.Site, answer), Now));
    });

    public void Refuse(SiteStream stream, Refusal refusal) => Guard(() =>
    {
        if (_seats[stream.Site] == stream)
            Do(_core.Step(new CoordinatorInput.RefusalArrived(stream.Site, refusal), Now));
    });

    /// <summary>Something unreadable or out of order came in: it is journalled, answered by a typed refusal, and the stream ends.</summary>
    public void Fault(SiteStream stream, Refusal refusal) => Guard(() =>
    {
        _journal.Store([new JournalEntry.Refused(stream.Site, false, refusal)], TakeBytes);
        _log.Warning("Refused a message of {Site}: {Reason}", stream.Name, refusal.Reason);
        Send(stream, new CoordinatorMessage.Refused(refusal));
        stream.Complete();
    });

    /// <summary>Asks for an orderly end.</summary>
    public void Stop() => Guard(() => Do(_core.Step(new CoordinatorInput.StopAsked(), Now)));

    public void Dispose() => _timer.Dispose();

    private void Wake() => Guard(() =>
    {
        _armed = null;
        Pulse();
        Do(_core.Step(new CoordinatorInput.Woke(), Now));
    });

    /// <summary>One at a time; nothing after the end; and whatever fails ends the coordinator instead of vanishing in a stream's task.</summary>
    private void Guard(Action action)
    {
        SiteStream[] streams;
        lock (_gate)
        {
            if (_finished || _done.Task.IsCompleted)
                return;
            try
            {
                action();
                if (!_finished)
                    Arm();
            }
#pragma warning disable CA1031 // It is not swallowed: the coordinator's main task rethrows it.
            catch (Exception failure)
#pragma warning restore CA1031
            {
                _done.TrySetException(failure);
            }

            streams = [.. _toFlush];
            _toFlush.Clear();
        }

        foreach (var stream in streams)
            stream.Flush();
        if (_finished)
            _done.TrySetResult();
    }

    private void Send(SiteStream stream, CoordinatorMessage message)
    {
        if (stream.TrySend(message))
            _toFlush.Add(stream);
        else
            stream.CutOff();
    }

    private void Do(CoordinatorStep step)
    {
        _journal.Store(step.Store, TakeBytes);
        foreach (var (site, message) in step.Send)
        {
            if (_seats[site] is { } stream)
                Send(stream, message);
        }

        foreach (var news in step.News)
            _progress.Tell(news, Now);
        if (!step.Finished)
            return;
        foreach (var seat in _seats)
            seat?.Complete();
        _finished = true;
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

    private void Pulse()
    {
        if (Now < _nextPulse)
            return;
        _nextPulse = Now + TimeSpan.FromSeconds(WireContract.PulseSeconds);
        foreach (var seat in _seats)
        {
            if (seat is null)
                continue;
            if (seat.TrySendPulse())
                _toFlush.Add(seat);
            else
                seat.CutOff();
        }
    }

    /// <summary>Sets the one timer to the earlier of the core's wake-up and the next pulse. Later wake-ups than the armed one leave it be.</summary>
    private void Arm()
    {
        var at = _core.WakeAt is { } wake && wake < _nextPulse ? wake : _nextPulse;
        if (_armed is { } armed && armed <= at)
            return;
        _armed = at;
        var wait = at - Now;
        _timer.Change(wait > TimeSpan.Zero ? wait + TimeSpan.FromMilliseconds(1) : TimeSpan.Zero, Timeout.InfiniteTimeSpan);
    }
}
