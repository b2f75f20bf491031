using Halfvoice.Coordination;

namespace Halfvoice.Wire;

/// <summary>The site's end of a stream: reads what the coordinator sent, checking everything, and writes the site's messages.</summary>
public sealed class CoordinatorWire
{
    private readonly HeaderWriter _writer = new();
    private readonly HeaderReader _reader = new();

    /// <summary>Reads a message; exactly one of the results is not null.</summary>
    public (FromCoordinatorMessage? Message, WireFault? Fault) Read(V1.FromCoordinator message)
    {
        if (_reader.Check(message.Header) is { } fault)
            return (null, fault);
        var id = HeaderReader.IdOf(message.Header);
        switch (message.BodyCase)
        {
            case V1.FromCoordinator.BodyOneofCase.Welcome:
                return (new FromCoordinatorMessage.Welcomed(new Welcome((int)Math.Min(message.Welcome.NextCycle, int.MaxValue))), null);
            case V1.FromCoordinator.BodyOneofCase.Ask:
                return ReadAsk(id, message.Ask);
            case V1.FromCoordinator.BodyOneofCase.Refusal:
                return (new FromCoordinatorMessage.Refused(Refusals.Read(id, message.Refusal)), null);
            case V1.FromCoordinator.BodyOneofCase.Outcome:
                return ReadOutcome(id, message.Outcome);
            case V1.FromCoordinator.BodyOneofCase.Pulse:
                return (new FromCoordinatorMessage.Pulse(), null);
            case V1.FromCoordinator.BodyOneofCase.Farewell:
                var text = message.Farewell.Text;
                return (new FromCoordinatorMessage.Farewell(text.Length > WireContract.MaxText ? text[..WireContract.MaxText] : text), null);
            default:
                return (null, new WireFault(RefusalReason.Malformed, "The message has no body that this version knows."));
        }
    }

    public V1.FromSite WriteEnrol(string site, Enrol enrol) => new()
    {
        Header = _writer.Next(RoundId.None),
        Enrol = new V1.Enrol
        {
            Site = site,
            SetupDigest = enrol.SetupDigest,
            LatticeExponent = enrol.LatticeExponent,
            NoiseScale = enrol.NoiseScale,
            EpsilonPerAnswer = enrol.EpsilonPerAnswer,
            AnsweredCycle = (uint)enrol.AnsweredThrough.Cycle,
            AnsweredRound = (uint)enrol.AnsweredThrough.Round,
        },
    };

    public V1.FromSite WriteAnswer(Answer answer)
    {
        var message = new V1.Answer { Everything = answer.Everything };
        message.Steps.AddRange(answer.Steps);
        return new V1.FromSite { Header = _writer.Next(answer.Id), Answer = message };
    }

    public V1.FromSite WriteRefusal(Refusal refusal) => new() { Header = _writer.Next(refusal.Id), Refusal = Refusals.Write(refusal) };

    public V1.FromSite WritePulse() => new() { Header = _writer.Next(RoundId.None), Pulse = new V1.Pulse() };

    public V1.FromSite WriteFarewell(string text) =>
        new() { Header = _writer.Next(RoundId.None), Farewell = new V1.Farewell { Text = text } };

    private static (FromCoordinatorMessage? Message, WireFault? Fault) ReadAsk(RoundId id, V1.Ask ask)
    {
        if (id.Cycle == 0 || id.Round == 0)
            return (null, new WireFault(RefusalReason.Malformed, "An ask names its cycle and round."));
        if (ask.Consensus.Count > WireContract.MaxComponents || ask.Consensus.Count != ask.Dual.Count)
            return (null, new WireFault(RefusalReason.Malformed, "An ask has one consensus value and one dual for each component."));
        if (!AllUsable(ask.Consensus) || !AllUsable(ask.Dual))
            return (null, new WireFault(RefusalReason.OutOfRange, "A number of the ask is not finite, or is beyond any network."));
        return (new FromCoordinatorMessage.Asked(new Ask(id, ask.Everything, [.. ask.Consensus], [.. ask.Dual])), null);
    }

    private static (FromCoordinatorMessage? Message, WireFault? Fault) ReadOutcome(RoundId id, V1.Outcome outcome)
    {
        if (id.Cycle == 0 || outcome.End == V1.CycleEnd.Unspecified || !Enum.IsDefined(outcome.End) || outcome.Rounds > int.MaxValue)
            return (null, new WireFault(RefusalReason.Malformed, "An outcome names its cycle, its end and its rounds."));
        if (outcome.Consensus.Count > WireContract.MaxComponents || outcome.Dual.Count != outcome.Consensus.Count)
            return (null, new WireFault(RefusalReason.Malformed, "An outcome has one consensus value and one dual for each component."));
        if (!AllUsable(outcome.Consensus) || !AllUsable(outcome.Dual))
            return (null, new WireFault(RefusalReason.OutOfRange, "A number of the outcome is not finite, or is beyond any network."));
        var read = new Outcome(id.Cycle, (CycleEnd)((int)outcome.End - 1), (int)outcome.Rounds, [.. outcome.Consensus], [.. outcome.Dual]);
        return (new FromCoordinatorMessage.Ended(read), null);
    }

    private static bool AllUsable(IEnumerable<double> values)
    {
        foreach (var value in values)
        {
            if (!(Math.Abs(value) <= WireContract.MaxMagnitude))
                return false;
        }

        return true;
    }
}
