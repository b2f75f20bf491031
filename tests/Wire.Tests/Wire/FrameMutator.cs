using Google.Protobuf;
using Google.Protobuf.Collections;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Tests.Wire;

/// <summary>Makes wrong frames out of right ones: wrong numbers in right places, and wrong bytes anywhere.</summary>
internal sealed class FrameMutator(int seed)
{
    private static readonly double[] _doubles =
    [
        0, -0.0, 1, -1, 1e-300, -1e-300, double.Epsilon, 1e9, -1e9, 1e150, -1e150, double.MaxValue, double.MinValue, double.NaN,
            double.PositiveInfinity, double.NegativeInfinity,
    ];

    private static readonly long[] _steps = [0, 1, -1, 1L << 20, -(1L << 20), 1L << 40, 1L << 53, long.MaxValue, long.MinValue, long.MaxValue - 1];

    private static readonly uint[] _counts = [0, 1, 2, 3, 20, 21, 400, 401, int.MaxValue - 1, int.MaxValue, 1u << 31, uint.MaxValue];

    private readonly Random _random = new(seed);

    public bool Chance(double share) => _random.NextDouble() < share;

    public int Below(int bound) => _random.Next(bound);

    /// <summary>Changes up to three fields of a site's message.</summary>
    public void Change(V1.FromSite message)
    {
        for (var times = 1 + Below(3); times > 0; times--)
        {
            if (Chance(0.2))
                Change(message.Header);
            else if (message.Enrol is { } enrol)
                Change(enrol);
            else if (message.Answer is { } answer)
                Change(answer);
            else if (message.Refusal is { } refusal)
                Change(refusal);
        }
    }

    /// <summary>Changes up to three fields of a coordinator's message.</summary>
    public void Change(V1.FromCoordinator message)
    {
        for (var times = 1 + Below(3); times > 0; times--)
        {
            if (Chance(0.2))
                Change(message.Header);
            else if (message.Welcome is { } welcome)
                welcome.NextCycle = Pick(_counts);
            else if (message.Ask is { } ask)
                Change(ask);
            else if (message.Outcome is { } outcome)
                Change(outcome);
            else if (message.Refusal is { } refusal)
                Change(refusal);
        }
    }

    /// <summary>The frame's bytes, most of the time as they are and otherwise damaged.</summary>
    public byte[] Bytes(IMessage message, double damaged)
    {
        var bytes = message.ToByteArray();
        if (!Chance(damaged) || bytes.Length == 0)
            return bytes;
        var at = Below(bytes.Length);
        switch (Below(5))
        {
            case 0:
                bytes[at] ^= (byte)(1 << Below(8));
                return bytes;
            case 1:
                bytes[at] = (byte)Below(256);
                return bytes;
            case 2:
                return bytes[..at];
            case 3:
                return [.. bytes[..at], .. bytes[Below(at + 1)..]];
            default:
                var noise = new byte[1 + Below(20)];
                _random.NextBytes(noise);
                return [.. bytes[..at], .. noise, .. bytes[at..]];
        }
    }

    private T Pick<T>(T[] values) => values[Below(values.Length)];

    private double Double() => Chance(0.5) ? Pick(_doubles) : (_random.NextDouble() - 0.5) * Math.Pow(10, Below(12) - 4);

    private string Text() => Below(4) switch
    {
        0 => "",
        1 => new string('x', Below(2000)),
        2 => "\U0001F50C\uFFFF\0",
        _ => "low",
    };

    private void Change(V1.Header header)
    {
        switch (Below(4))
        {
            case 0:
                header.Cycle = Pick(_counts);
                break;
            case 1:
                header.Round = Pick(_counts);
                break;
            case 2:
                header.Sequence = Pick(_counts);
                break;
            default:
                header.Protocol = Pick(_counts);
                break;
        }
    }

    private void Change(V1.Enrol enrol)
    {
        switch (Below(7))
        {
            case 0:
                enrol.LatticeExponent = Chance(0.5) ? Below(500) - 250 : Pick([int.MinValue, int.MaxValue, -200, 200, 0]);
                break;
            case 1:
                enrol.NoiseScale = Double();
                break;
            case 2:
                enrol.EpsilonPerAnswer = Double();
                break;
            case 3:
                enrol.AnsweredCycle = Pick(_counts);
                break;
            case 4:
                enrol.AnsweredRound = Pick(_counts);
                break;
            case 5:
                enrol.Site = Text();
                break;
            default:
                if (Chance(0.2))
                    enrol.SetupDigest = Text();
                break;
        }
    }

    private void Change(V1.Answer answer)
    {
        if (Chance(0.15))
            answer.Everything = !answer.Everything;
        else if (Chance(0.3))
            Resize(answer.Steps, Pick(_steps));
        else if (answer.Steps.Count > 0)
            answer.Steps[Below(answer.Steps.Count)] = Pick(_steps);
    }

    private void Change(V1.Refusal refusal)
    {
        refusal.Reason = (V1.RefusalReason)(Below(20) - 4);
        refusal.Text = Text();
    }

    private void Change(V1.Ask ask)
    {
        if (Chance(0.1))
            ask.Everything = !ask.Everything;
        else if (Chance(0.2))
            Resize(Chance(0.5) ? ask.Consensus : ask.Dual, Double());
        else
            Replace(Chance(0.5) ? ask.Consensus : ask.Dual);
    }

    private void Change(V1.Outcome outcome)
    {
        if (Chance(0.2))
            outcome.End = (V1.CycleEnd)(Below(10) - 2);
        else if (Chance(0.2))
            outcome.Rounds = Pick(_counts);
        else if (Chance(0.3))
            Resize(Chance(0.5) ? outcome.Consensus : outcome.Dual, Double());
        else
            Replace(Chance(0.5) ? outcome.Consensus : outcome.Dual);
    }

    private void Replace(RepeatedField<double> values)
    {
        if (values.Count > 0)
            values[Below(values.Count)] = Double();
    }

    private void Resize<T>(RepeatedField<T> values, T extra)
    {
        if (values.Count > 0 && Chance(0.5))
            values.RemoveAt(Below(values.Count));
        else
            values.Add(extra);
    }
}
