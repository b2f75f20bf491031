using Halfvoice.Coordination;

namespace Halfvoice.Wire;

/// <summary>
/// The coordinator's end: reads what a site sent, checking everything before use, and writes what the core wants to say.
/// One instance a stream, for the running sequence numbers.
/// </summary>
public sealed class SiteWire
{
    private readonly HeaderWriter _writer = new();
    private readonly HeaderReader _reader = new();

    /// <summary>Reads a message of an enrolled or enrolling site; exactly one of the results is not null.</summary>
    public (FromSiteMessage? Message, WireFault? Fault) Read(V1.FromSite message)
    {
        if (_reader.Check(message.Header) is { } fault)
            return (null, fault);
        var id = HeaderReader.IdOf(message.Header);
        switch (message.BodyCase)
        {
            case V1.FromSite.BodyOneofCase.Enrol:
                return ReadEnrol(message.Enrol);
            case V1.FromSite.BodyOneofCase.Answer:
                if (id.Cycle == 0 || id.Round == 0)
                    return (null, new WireFault(RefusalReason.Malformed, "An answer names its cycle and round."));
                if (message.Answer.Steps.Count > WireContract.MaxComponents)
                    return (null, new WireFault(RefusalReason.Malformed, "The answer has more numbers than any site has."));
                return (new FromSiteMessage.Answered(new Answer(id, message.Answer.Everything, [.. message.Answer.Steps])), null);
            case V1.FromSite.BodyOneofCase.Refusal:
                return (new FromSiteMessage.Refused(Refusals.Read(id, message.Refusal)), null);
            case V1.FromSite.BodyOneofCase.Pulse:
                return (new FromSiteMessage.Pulse(), null);
            case V1.FromSite.BodyOneofCase.Farewell:
                return (new FromSiteMessage.Farewell(), null);
            default:
                return (null, new WireFault(RefusalReason.Malformed, "The message has no body that this version knows."));
        }
    }

    /// <summary>Writes a message of the core.</summary>
    public V1.FromCoordinator Write(CoordinatorMessage message)
    {
        switch (message)
        {
            case CoordinatorMessage.Welcomed welcomed:
                return new V1.FromCoordinator
                {
                    Header = _writer.Next(RoundId.None),
                    Welcome = new V1.Welcome { NextCycle = (uint)welcomed.Welcome.NextCycle },
                };
            case CoordinatorMessage.Asked asked:
                var ask = new V1.Ask { Everything = asked.Ask.Everything };
                ask.Consensus.AddRange(asked.Ask.Consensus);
                ask.Dual.AddRange(asked.Ask.Dual);
                return new V1.FromCoordinator { Header = _writer.Next(asked.Ask.Id), Ask = ask };
            case CoordinatorMessage.Refused refused:
                return new V1.FromCoordinator { Header = _writer.Next(refused.Refusal.Id), Refusal = Refusals.Write(refused.Refusal) };
            case CoordinatorMessage.Ended ended:
                var outcome = new V1.Outcome { End = (V1.CycleEnd)((int)ended.Outcome.End + 1), Rounds = (uint)ended.Outcome.Rounds };
                outcome.Consensus.AddRange(ended.Outcome.Consensus);
                outcome.Dual.AddRange(ended.Outcome.Dual);
                return new V1.FromCoordinator { Header = _writer.Next(new RoundId(ended.Outcome.Cycle, ended.Outcome.Rounds)), Outcome = outcome };
            case CoordinatorMessage.Farewell farewell:
                return new V1.FromCoordinator { Header = _writer.Next(RoundId.None), Farewell = new V1.Farewell { Text = farewell.Text } };
            default:
                throw new ArgumentOutOfRangeException(nameof(message));
        }
    }

    /// <summary>A sign of life.</summary>
    public V1.FromCoordinator WritePulse() => new() { Header = _writer.Next(RoundId.None), Pulse = new V1.Pulse() };

    private static (FromSiteMessage? Message, WireFault? Fault) ReadEnrol(V1.Enrol enrol)
    {
        if (enrol.LatticeExponent is < -200 or > 200)
            return (null, new WireFault(RefusalReason.OutOfRange, "The lattice exponent must be within -200 to 200."));
        if (!(enrol.NoiseScale is >= 0 and <= WireContract.MaxNoiseScale))
            return (null, new WireFault(RefusalReason.OutOfRange, "The noise scale must be finite, not negative and at most 1e30."));
        if (!(enrol.EpsilonPerAnswer >= 0) || !double.IsFinite(enrol.EpsilonPerAnswer))
            return (null, new WireFault(RefusalReason.OutOfRange, "The epsilon must be finite and not negative."));
        if (enrol.Site.Length > WireContract.MaxText || enrol.SetupDigest.Length > WireContract.MaxText)
            return (null, new WireFault(RefusalReason.Malformed, "A text is too long."));
        if (enrol.AnsweredCycle > int.MaxValue || enrol.AnsweredRound > int.MaxValue)
            return (null, new WireFault(RefusalReason.OutOfRange, "A cycle or round is beyond any plan."));
        var read = new Enrol(enrol.SetupDigest, enrol.LatticeExponent, enrol.NoiseScale, enrol.EpsilonPerAnswer,
            new RoundId((int)enrol.AnsweredCycle, (int)enrol.AnsweredRound));
        return (new FromSiteMessage.Enrolled(enrol.Site, read), null);
    }
}
