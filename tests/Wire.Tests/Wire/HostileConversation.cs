using Google.Protobuf;
using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Privacy;
using Halfvoice.Wire;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Tests.Wire;

/// <summary>
/// A coordinator's real core with honest sites and one hostile one, whose frames go through the real parser and the real checks as
/// in the host. Nothing the hostile site sends may make it throw or make the honest ones see numbers that are none.
/// </summary>
internal sealed class HostileConversation
{
    private const int Hostile = 0;

    private readonly SetupBuilder _setups;
    private readonly CoordinatorCore _coordinator;
    private readonly SiteCore[] _sites;
    private readonly Queue<(int Site, CoordinatorMessage Message)> _queue = new();
    private readonly FrameMutator _mutator;
    private Ask? _lastAsk;
    private TimeSpan _now;

    public HostileConversation(Plan plan, FrameMutator mutator)
    {
        _mutator = mutator;
        _setups = new SetupBuilder(plan);
        _coordinator = new CoordinatorCore(_setups.Coordinator);
        _sites = plan.Network.Sites.Select((site, i) => new SiteCore(
            _setups.ForSite(site), new SeriesOf(plan.Loads[site]), new SeededNoiseSource(7, (ulong)i), [], out _)).ToArray();
        Take(new CoordinatorInput.Started());
        for (var s = 0; s < _sites.Length; s++)
            Take(new CoordinatorInput.SiteJoined(s, _sites[s].Enrolment()));
    }

    public bool Finished { get; private set; }

    /// <summary>Sends one mutated frame; true where it passed the parser and the wire's checks.</summary>
    public bool SendMutated()
    {
        var message = Template();
        _mutator.Change(message);
        V1.FromSite parsed;
        try
        {
            parsed = V1.FromSite.Parser.ParseFrom(_mutator.Bytes(message, 0.3));
        }
        catch (InvalidProtocolBufferException)
        {
            return false;
        }

        var (read, fault) = new SiteWire().Read(parsed);
        Assert.True((read is null) != (fault is null));
        if (read is null)
        {
            Assert.InRange(fault!.Text.Length, 1, WireContract.MaxText);
            return false;
        }

        Feed(read);
        Pump();
        if (_coordinator.WakeAt is { } wake && _mutator.Chance(0.05))
        {
            _now = wake;
            Take(new CoordinatorInput.Woke());
            Pump();
        }

        return true;
    }

    private void Feed(FromSiteMessage read)
    {
        switch (read)
        {
            case FromSiteMessage.Enrolled enrolled:
                if (_mutator.Chance(0.8))
                    Take(new CoordinatorInput.SiteLeft(Hostile));
                Take(new CoordinatorInput.SiteJoined(Hostile, enrolled.Enrol));
                break;
            case FromSiteMessage.Answered answered:
                Take(new CoordinatorInput.AnswerArrived(Hostile, answered.Answer));
                break;
            case FromSiteMessage.Refused refused:
                Take(new CoordinatorInput.RefusalArrived(Hostile, refused.Refusal));
                break;
            default:
                break;
        }
    }

    private V1.FromSite Template()
    {
        var wire = new CoordinatorWire();
        var id = _lastAsk?.Id ?? new RoundId(1, 1);
        switch (_mutator.Below(20))
        {
            case 0:
                return wire.WriteEnrol("high", _sites[Hostile].Enrolment());
            case 1:
                return wire.WriteRefusal(new Refusal(id, RefusalReason.NoReading, "none"));
            case 2:
                return wire.WritePulse();
            case 3:
                return wire.WriteFarewell("bye");
            default:
                var everything = _lastAsk?.Everything ?? true;
                var numbers = everything ? _setups.Coordinator.Sites[Hostile].Components.Count : _lastAsk!.Consensus.Length;
                return wire.WriteAnswer(new Answer(id, everything, Enumerable.Range(0, numbers).Select(_ => (long)_mutator.Below(1 << 30)).ToArray()));
        }
    }

    private void Pump()
    {
        while (_queue.TryDequeue(out var next))
        {
            SiteInput? input = next.Message switch
            {
                CoordinatorMessage.Asked asked => new SiteInput.Asked(asked.Ask),
                CoordinatorMessage.Ended ended => new SiteInput.Ended(ended.Outcome),
                _ => null,
            };
            if (input is null || next.Site == Hostile)
                continue;
            var reply = _sites[next.Site].Step(input, TimeSpan.FromSeconds(1)).Reply;
            _sites[next.Site].PrepareNoise();
            if (reply is SiteReply.Answered answered)
                Take(new CoordinatorInput.AnswerArrived(next.Site, answered.Answer));
        }
    }

    private void Take(CoordinatorInput input)
    {
        var step = _coordinator.Step(input, _now);
        Finished |= step.Finished;
        foreach (var entry in step.Store)
            AssertFinite(entry);
        foreach (var (site, message) in step.Send)
        {
            // What an honest site is sent must pass its own checks, or it would hang up because of another's offence.
            var (_, fault) = new CoordinatorWire().Read(V1.FromCoordinator.Parser.ParseFrom(new SiteWire().Write(message).ToByteArray()));
            Assert.True(fault is null, $"An honest site would have refused what the hostile one brought about: {fault}");
            if (site == Hostile && message is CoordinatorMessage.Asked asked)
                _lastAsk = asked.Ask;
            _queue.Enqueue((site, message));
        }
    }

    /// <summary>A measure that is no number can be neither journalled nor shown.</summary>
    private static void AssertFinite(JournalEntry entry)
    {
        var measure = entry switch
        {
            JournalEntry.RoundClosed closed => closed.Measure,
            JournalEntry.CycleClosed closed => closed.Measure,
            _ => default,
        };
        foreach (var value in new[] { measure.MismatchMw, measure.PriceMovePerMwh, measure.MismatchFloorMw, measure.PriceFloorPerMwh })
            Assert.True(double.IsFinite(value), $"{measure}");
    }

    private sealed class SeriesOf(LoadSeries series) : ILoadReadings
    {
        public bool TryRead(int cycle, Span<double> loadMw)
        {
            series.At(cycle).CopyTo(loadMw);
            return true;
        }
    }
}
