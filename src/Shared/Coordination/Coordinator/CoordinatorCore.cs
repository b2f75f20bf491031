namespace Halfvoice.Coordination;

/// <summary>
/// The coordinator as a pure state machine: one door in (<see cref="Step"/>), one record out (<see cref="CoordinatorStep"/>,
/// whose docs say what is stored before what is sent), time as a parameter, one wake-up time. Not thread-safe; the host
/// feeds it from one queue.
/// </summary>
/// <remarks>
/// A round closes as soon as every asked site has answered or refused, otherwise at its deadline. It counts when at least
/// the quorum answered afresh; a missing site's last answer stands in for at most <c>hold_rounds</c> rounds in a row. Late
/// and repeated answers change nothing.
/// </remarks>
public sealed class CoordinatorCore
{
    /// <summary>Seconds to wait for all sites before starting with a quorum of them.</summary>
    public const double GatherSeconds = 30;

    private readonly CoordinatorSetup _setup;
    private readonly CoordinatorScheme _scheme;
    private readonly SiteSeat[] _seats;
    private readonly CoordinatorStep _out = new();
    private readonly List<(int Site, Answer Answer)> _answers = [];
    private readonly List<int> _held = [];
    private Phase _phase = Phase.Idle;
    private RoundId _id;
    private RoundId _first = new(1, 0);
    private TimeSpan _cycleBegan;
    private TimeSpan _roundBegan;
    private RoundMeasure _measure;
    private int _asked;
    private int _outstanding;

    public CoordinatorCore(CoordinatorSetup setup)
    {
        _setup = setup;
        _scheme = CoordinatorScheme.Create(setup);
        _seats = setup.Sites.Select(site => new SiteSeat(site)).ToArray();
    }

    private enum Phase
    {
        Idle,
        Gathering,
        Asking,
        Finished,
    }

    /// <summary>When the host must send <see cref="CoordinatorInput.Woke"/>; null for never.</summary>
    public TimeSpan? WakeAt { get; private set; }

    /// <summary>Goes on after a crash: with the cycle and round that may have been asked, and the state that it was asked from.</summary>
    /// <param name="last">The last round in the journal that was asked; none of its kind is asked again.</param>
    /// <param name="cycleClosed">Whether the cycle of that round is closed in the journal.</param>
    public void Resume(RoundId last, bool cycleClosed, CoordinatorState state)
    {
        if (_phase != Phase.Idle)
            throw new InvalidOperationException("A coordinator resumes before it starts.");
        state.Consensus.CopyTo(_scheme.Consensus, 0);
        state.Dual.CopyTo(_scheme.Dual, 0);
        _first = cycleClosed ? new RoundId(last.Cycle + 1, 0) : last;
    }

    /// <summary>Takes one input at a time that never runs backwards; the result is valid until the next call.</summary>
    public CoordinatorStep Step(CoordinatorInput input, TimeSpan now)
    {
        _out.Clear();
        switch (input)
        {
            case CoordinatorInput.Started:
                _phase = Phase.Gathering;
                WakeAt = now + TimeSpan.FromSeconds(GatherSeconds);
                break;
            case CoordinatorInput.SiteJoined joined:
                Join(joined.Site, joined.Enrol, now);
                break;
            case CoordinatorInput.SiteLeft left:
                Leave(left.Site, now);
                break;
            case CoordinatorInput.AnswerArrived arrived:
                Hear(arrived.Site, arrived.Answer, now);
                break;
            case CoordinatorInput.RefusalArrived refused:
                HearRefusal(refused.Site, refused.Refusal, now);
                break;
            case CoordinatorInput.Woke:
                Wake(now);
                break;
            case CoordinatorInput.StopAsked:
                Stop(now);
                break;
            default:
                throw new ArgumentOutOfRangeException(nameof(input));
        }

        // A round in which nobody has anything to answer is over as it begins. A loop: a run may have 100,000 such cycles.
        while (_phase == Phase.Asking && _asked == 0)
            CloseRound(now);
        _out.Finished = _phase == Phase.Finished;
        return _out;
    }

    private void Join(int site, Enrol enrol, TimeSpan now)
    {
        var seat = _seats[site];
        if (seat.Joined)
        {
            Refuse(site, new Refusal(_id, RefusalReason.AlreadyJoined, "This site already has a live stream."));
            return;
        }

        if (enrol.SetupDigest != _setup.SetupDigest)
        {
            Refuse(site, new Refusal(_id, RefusalReason.NotOurPlan, "The site's bundle was made from another plan or an older one; pack both ends again."));
            return;
        }

        if (!seat.IsPlausible(enrol))
        {
            Refuse(site, new Refusal(_id, RefusalReason.OutOfRange, "The declared noise or lattice is far beyond the public bounds of the site's values."));
            return;
        }

        seat.Join(enrol);
        for (var k = _scheme.Map.Start(site); k < _scheme.Map.Start(site) + _scheme.Map.CountOf(site); k++)
            _scheme.NoiseScale[k] = enrol.NoiseScale;
        _out.Store.Add(new JournalEntry.SiteJoined(site, enrol));
        _out.Send.Add((site, new CoordinatorMessage.Welcomed(new Welcome(Math.Max(_first.Cycle, _id.Cycle)))));
        _out.News.Add(new CoordinatorNews.Gathering(_seats.Count(s => s.Joined), _seats.Length));
        if (_phase == Phase.Gathering && _seats.All(s => s.Joined))
            BeginCycle(_first.Cycle, _first.Round, now);
    }

    private void Leave(int site, TimeSpan now)
    {
        var seat = _seats[site];
        if (!seat.Joined)
            return;
        seat.Leave();
        _out.Store.Add(new JournalEntry.SiteLeft(site));
        if (_phase == Phase.Asking && seat.Awaited)
        {
            seat.Awaited = false;
            _outstanding--;
            CloseIfComplete(now);
        }
    }

    private void Wake(TimeSpan now)
    {
        if (WakeAt is not { } at || now < at)
            return;
        WakeAt = null;
        if (_phase == Phase.Gathering)
        {
            if (HasQuorum(_seats.Count(s => s.Joined), _seats.Length))
                BeginCycle(_first.Cycle, _first.Round, now);
            else
                WakeAt = now + TimeSpan.FromSeconds(GatherSeconds);
        }
        else if (_phase == Phase.Asking)
        {
            CloseRound(now);
        }
    }

    private bool HasQuorum(int fresh, int asked) => fresh >= Math.Ceiling((_setup.Quorum * asked) - 1e-9);

    /// <param name="cycle">The cycle to run.</param>
    /// <param name="afterRound">0, or after a crash the last round of that cycle that may have been asked.</param>
    private void BeginCycle(int cycle, int afterRound, TimeSpan now)
    {
        if (cycle > _setup.Cycles)
        {
            Finish("All cycles are done.");
            return;
        }

        _id = new RoundId(cycle, afterRound);
        _cycleBegan = now;
        _measure = default;
        _scheme.BeginCycle();
        foreach (var seat in _seats)
            seat.Age = 0;
        _out.News.Add(new CoordinatorNews.CycleBegan(cycle));

        // After a crash in the last round allowed, which is not asked again, there is none left to ask.
        if (afterRound >= _setup.RoundCap)
            EndCycle(CycleEnd.RoundCap, now);
        else
            BeginRound(now);
    }

    private void BeginRound(TimeSpan now)
    {
        _id = new RoundId(_id.Cycle, _id.Round + 1);
        _phase = Phase.Asking;
        _roundBegan = now;
        _asked = 0;
        _outstanding = 0;
        _answers.Clear();
        _held.Clear();
        var asks = new List<(int Site, Ask Ask)>(_seats.Length);
        for (var s = 0; s < _seats.Length; s++)
        {
            var seat = _seats[s];
            seat.Awaited = false;
            seat.Fresh = false;
            seat.InRound = _scheme.NeedsAnswer(s);
            if (!seat.InRound)
                continue;
            _asked++;
            if (!seat.Joined || _id <= seat.AnsweredThrough)
                continue;
            var ask = _scheme.BuildAsk(s, _id);
            seat.Awaited = true;
            _outstanding++;
            asks.Add((s, ask));
            _out.Send.Add((s, new CoordinatorMessage.Asked(ask)));
        }

        var state = new CoordinatorState([.. _scheme.Consensus], [.. _scheme.Dual]);
        _out.Store.Add(new JournalEntry.RoundAsked(_id, asks, state));
        WakeAt = now + TimeSpan.FromSeconds(_setup.DeadlineSeconds);
    }

    private void Hear(int site, Answer answer, TimeSpan now)
    {
        var seat = _seats[site];
        if (_phase != Phase.Asking || !seat.Awaited || answer.Id != _id)
        {
            var text = answer.Id < _id ? "The round is closed." : "Nothing was asked under this number.";
            _out.Store.Add(new JournalEntry.Refused(site, false, new Refusal(answer.Id, RefusalReason.OutOfOrder, text)));
            return;
        }

        var everything = _scheme.WantsEverything(site);
        if (answer.Everything != everything || answer.Steps.Length != _scheme.AnswerLength(site, everything))
        {
            Refuse(site, new Refusal(_id, RefusalReason.Malformed, $"The answer must have {_scheme.AnswerLength(site, everything)} numbers."));
            return;
        }

        if (!seat.TryRead(answer, out var values))
        {
            Refuse(site, new Refusal(_id, RefusalReason.OutOfRange, "A number lies outside the public bounds."));
            return;
        }

        _scheme.Take(site, everything, values);
        seat.Awaited = false;
        seat.Fresh = true;
        _outstanding--;
        _answers.Add((site, answer));
        CloseIfComplete(now);
    }

    private void HearRefusal(int site, Refusal refusal, TimeSpan now)
    {
        _out.Store.Add(new JournalEntry.Refused(site, true, refusal));
        if (_phase != Phase.Asking || refusal.Id != _id || !_seats[site].Awaited)
            return;
        _seats[site].Awaited = false;
        _outstanding--;
        CloseIfComplete(now);
    }

    private void CloseIfComplete(TimeSpan now)
    {
        // Under the quorum the deadline is waited for, in case a site comes back within the round's time.
        if (_phase == Phase.Asking && _outstanding == 0 && HasQuorum(_answers.Count, _asked))
            CloseRound(now);
    }

    private void CloseRound(TimeSpan now)
    {
        if (!HasQuorum(_answers.Count, _asked))
        {
            EndCycle(CycleEnd.NoQuorum, now);
            return;
        }

        for (var s = 0; s < _seats.Length; s++)
        {
            var seat = _seats[s];
            if (!seat.InRound)
                continue;
            seat.Age = seat.Fresh ? 0 : seat.Age + 1;
            if (!seat.Fresh)
                _held.Add(s);
        }

        _measure = _scheme.Close();
        var seconds = (now - _roundBegan).TotalSeconds;
        _out.Store.Add(new JournalEntry.RoundClosed(_id, [.. _answers], [.. _held], _measure, seconds));
        _out.News.Add(new CoordinatorNews.RoundDone(_id, _measure, _answers.Count, _asked));
        if (_seats.Any(seat => seat.Age > _setup.HoldRounds))
            EndCycle(CycleEnd.SiteLost, now);
        else if (StopRule.Settled(_measure, _setup) && _scheme.AllKnown)
            EndCycle(CycleEnd.Settled, now);
        else if (_id.Round >= _setup.RoundCap)
            EndCycle(CycleEnd.RoundCap, now);
        else
            BeginRound(now);
    }

    private void EndCycle(CycleEnd end, TimeSpan now)
    {
        var rounds = _id.Round;
        for (var s = 0; s < _seats.Length; s++)
        {
            _seats[s].Awaited = false;
            if (!_seats[s].Joined)
                continue;
            var (consensus, dual) = _scheme.Final(s);
            _out.Send.Add((s, new CoordinatorMessage.Ended(new Outcome(_id.Cycle, end, rounds, consensus, dual))));
        }

        _scheme.EndCycle();
        var seconds = (now - _cycleBegan).TotalSeconds;
        var state = new CoordinatorState([.. _scheme.Consensus], [.. _scheme.Dual]);
        _out.Store.Add(new JournalEntry.CycleClosed(_id.Cycle, end, rounds, _measure, seconds, _scheme.UnservedMw, state));
        _out.News.Add(new CoordinatorNews.CycleDone(_id.Cycle, end, rounds, seconds, _measure));
        WakeAt = null;
        if (end == CycleEnd.Stopped)
            Finish("The coordinator was asked to stop.");
        else
            BeginCycle(_id.Cycle + 1, 0, now);
    }

    private void Stop(TimeSpan now)
    {
        if (_phase == Phase.Asking)
            EndCycle(CycleEnd.Stopped, now);
        else if (_phase != Phase.Finished)
            Finish("The coordinator was asked to stop.");
    }

    private void Finish(string text)
    {
        _phase = Phase.Finished;
        WakeAt = null;
        for (var s = 0; s < _seats.Length; s++)
        {
            if (_seats[s].Joined)
                _out.Send.Add((s, new CoordinatorMessage.Farewell(text)));
        }
    }

    private void Refuse(int site, Refusal refusal)
    {
        _out.Store.Add(new JournalEntry.Refused(site, false, refusal));
        _out.Send.Add((site, new CoordinatorMessage.Refused(refusal)));
    }
}
