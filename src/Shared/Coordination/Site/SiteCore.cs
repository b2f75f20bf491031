using System.Runtime.InteropServices;
using Halfvoice.Privacy;

namespace Halfvoice.Coordination;

/// <summary>
/// A site as a pure state machine: one door in (<see cref="Step"/>), one record out (<see cref="SiteStep"/>, whose docs say
/// what is stored before what is sent). Loads and noise are passed in. Not thread-safe.
/// </summary>
/// <remarks>
/// No answer leaves before its charge is durable: charges are reserved for a block of rounds ahead and stored before the
/// first answer of the block. The same ask gets the identical bytes; the same round with another ask is refused; after a
/// restart the reserved rounds are forfeited.
/// </remarks>
public sealed class SiteCore
{
    /// <summary>
    /// Rounds that a charge is reserved for ahead, so that one durable write serves them all. A crash forfeits one block, so
    /// blocks are short where rounds are slow: one that is used up within a second is followed by one twice as long, one that
    /// lasted over four seconds by one half as long.
    /// </summary>
    public const int FirstBlock = 16;

    /// <inheritdoc cref="FirstBlock"/>
    public const int ShortestBlock = 8;

    /// <inheritdoc cref="FirstBlock"/>
    public const int LongestBlock = 256;

    private static readonly TimeSpan QuickBlock = TimeSpan.FromSeconds(1);
    private static readonly TimeSpan SlowBlock = TimeSpan.FromSeconds(4);

    private readonly SiteSetup _setup;
    private readonly ISiteScheme _scheme;
    private readonly SitePrivacy _privacy;
    private readonly ILoadReadings _loads;
    private readonly ChargeBook? _book;
    private readonly AnswerMemory _memory = new();
    private readonly SiteStep _out = new();
    private readonly double[] _loadMw;
    private readonly double[] _values;
    private readonly double[] _outputs;
    private ChargeRow? _block;
    private int _blockLength = FirstBlock;
    private TimeSpan _blockBegan;
    private TimeSpan _now;
    private int _usedOfBlock;
    private int _loadCycle;
    private long[]? _fixedSteps;
    private int _fixedCycle;
    private RoundId _lastAnswered;

    /// <param name="setup">The site's bundle.</param>
    /// <param name="loads">Where loads come from.</param>
    /// <param name="noise">The operating system's generator in an agent; a seeded one only in virtual time.</param>
    /// <param name="ledger">All rows of the site's ledger.</param>
    /// <param name="forfeited">Rows that changed by the restart; the host stores them before the first step.</param>
    public SiteCore(SiteSetup setup, ILoadReadings loads, INoiseSource noise, IEnumerable<ChargeRow> ledger, out IReadOnlyList<ChargeRow> forfeited)
    {
        _setup = setup;
        _loads = loads;
        _scheme = SiteSchemes.Create(setup);
        _privacy = new SitePrivacy(setup, _scheme, noise);
        _loadMw = new double[setup.Buses.Count];
        _values = new double[_scheme.ComponentCount];
        _outputs = new double[setup.Generators.Count];
        forfeited = [];
        if (_privacy.Allowance is { } allowance)
        {
            _book = ChargeBook.Restore(allowance, ledger, out forfeited);
            var (cycle, round) = _book.LastGranted;
            _memory.ForfeitThrough(cycle, round);
            _lastAnswered = new RoundId(cycle, round);
        }

        _privacy.PrepareNoise();
    }

    /// <summary>What the site says when it joins.</summary>
    public Enrol Enrolment() => new(
        _setup.SetupDigest, _privacy.Lattice.Exponent, _privacy.NoiseScale, _privacy.EpsilonPerAnswer, _lastAnswered);

    /// <summary>How the noise scale came about, in words and numbers.</summary>
    public SitePrivacy Privacy => _privacy;

    /// <summary>Takes one input; the result is valid until the next call.</summary>
    /// <param name="input">What happened.</param>
    /// <param name="now">Time since some start; never runs backwards.</param>
    public SiteStep Step(SiteInput input, TimeSpan now)
    {
        _now = now;
        _out.Clear();
        switch (input)
        {
            case SiteInput.Welcomed:
                break;
            case SiteInput.Asked asked:
                Answer(asked.Ask);
                break;
            case SiteInput.Ended ended:
                EndCycle(ended.Outcome);
                break;
            case SiteInput.Stopping:
                SettleBlock();
                break;
            default:
                throw new ArgumentOutOfRangeException(nameof(input));
        }

        return _out;
    }

    /// <summary>Draws the noise of the next answer ahead of its ask; the host calls it once a reply has left.</summary>
    public void PrepareNoise() => _privacy.PrepareNoise();

    private void Answer(Ask ask)
    {
        if (ask.Consensus.Length != _scheme.Adjustable.Count || ask.Dual.Length != ask.Consensus.Length)
        {
            Refuse(ask.Id, RefusalReason.Malformed, $"This site has {_scheme.Adjustable.Count} components that move.");
            return;
        }

        if (ask.Id.Cycle < 1 || ask.Id.Round < 1 || ask.Id.Round > _setup.RoundCap)
        {
            Refuse(ask.Id, RefusalReason.OutOfRange, $"Cycles count from 1, and the plan allows rounds 1 to {_setup.RoundCap}.");
            return;
        }

        if (!AllFinite(ask.Consensus) || !AllFinite(ask.Dual))
        {
            Refuse(ask.Id, RefusalReason.OutOfRange, "A number of the ask is not finite.");
            return;
        }

        if (ask.Id.Cycle > _setup.CampaignCycles)
        {
            // The allowance is counted by cycles, so cycles that the plan does not have must not open new ones.
            Refuse(ask.Id, RefusalReason.OutOfRange, $"The plan has {_setup.CampaignCycles} cycles.");
            return;
        }

        var digest = DigestOf(ask);
        switch (_memory.Look(ask.Id.Cycle, ask.Id.Round, digest))
        {
            case AnswerRepeated repeated:
                Reply(ask, MemoryMarshal.Cast<byte, long>(repeated.Bytes.Span).ToArray());
                return;
            case RoundRefused refused:
                Refuse(ask.Id, ReasonOf(refused.Reason), TextOf(refused.Reason));
                return;
            default:
                break;
        }

        if (!ReadLoads(ask.Id.Cycle))
        {
            Refuse(ask.Id, RefusalReason.NoReading, "The site has no load reading for this cycle.");
            return;
        }

        if (StepsFor(ask) is not { } steps)
            return;
        _memory.Keep(ask.Id.Cycle, ask.Id.Round, digest, MemoryMarshal.AsBytes(steps.AsSpan()));
        _lastAnswered = ask.Id;
        Reply(ask, steps);
    }

    /// <summary>
    /// A site that cannot move answers once a cycle: asked again, it repeats the released numbers, which releases nothing
    /// new. Any other site answers afresh. Null where the budget says no.
    /// </summary>
    private long[]? StepsFor(Ask ask)
    {
        var once = _scheme.Adjustable.Count == 0;
        if (once && _fixedCycle == ask.Id.Cycle && _fixedSteps is not null)
            return ask.Everything ? _fixedSteps : [];
        if (!Charge(ask.Id))
            return null;
        _scheme.Solve(_loadMw, ask, _values);
        var steps = _privacy.Release(_values, once || ask.Everything);
        if (once)
            (_fixedSteps, _fixedCycle) = (steps, ask.Id.Cycle);
        return once && !ask.Everything ? [] : steps;
    }

    /// <summary>Sees to it that the round lies in a reserved block; the row, if a new one is needed, goes out to be stored first.</summary>
    private bool Charge(RoundId id)
    {
        if (_book is null)
            return true;
        if (_block is not null && _block.Spans(id.Cycle, id.Round))
        {
            _usedOfBlock++;
            return true;
        }

        SettleBlock();
        var wanted = Math.Min(NextBlockLength(), _setup.RoundCap - id.Round + 1);
        var outcome = _book.TryReserve(id.Cycle, id.Round, Math.Max(1, Math.Min(wanted, _book.AnswersLeft(id.Cycle))));
        switch (outcome)
        {
            case Reservation reservation:
                _block = reservation.Row;
                _blockBegan = _now;
                _usedOfBlock = 1;
                _out.Charges.Add(reservation.Row);
                return true;
            case BudgetRefusal refusal:
                _out.Charges.Add(refusal.Row);
                Refuse(id, RefusalReason.BudgetSpent, refusal.Words);
                return false;
            default:
                Refuse(id, RefusalReason.OutOfOrder, "This round lies before one that was granted already.");
                return false;
        }
    }

    private int NextBlockLength()
    {
        var lasted = _now - _blockBegan;
        if (_blockBegan > TimeSpan.Zero && lasted < QuickBlock)
            _blockLength = Math.Min(LongestBlock, 2 * _blockLength);
        else if (lasted > SlowBlock)
            _blockLength = Math.Max(ShortestBlock, _blockLength / 2);
        return _blockLength;
    }

    private void SettleBlock()
    {
        if (_block is null || _book is null)
            return;
        _out.Charges.Add(_book.Settle(_block.Id, _usedOfBlock));
        _block = null;
        _usedOfBlock = 0;
    }

    private void EndCycle(Outcome outcome)
    {
        SettleBlock();
        if (outcome.Consensus.Length != _scheme.ComponentCount || outcome.Dual.Length != _scheme.ComponentCount)
        {
            Refuse(new RoundId(outcome.Cycle, outcome.Rounds), RefusalReason.Malformed, $"This site has {_scheme.ComponentCount} components.");
            return;
        }

        if (!AllFinite(outcome.Consensus) || !AllFinite(outcome.Dual))
        {
            Refuse(new RoundId(outcome.Cycle, outcome.Rounds), RefusalReason.OutOfRange, "A number of the outcome is not finite.");
            return;
        }

        if (outcome.Rounds == 0 || !ReadLoads(outcome.Cycle))
            return;
        _scheme.Dispatch(_loadMw, outcome, _outputs);
        for (var g = 0; g < _outputs.Length; g++)
            _out.SetPoints.Add(new SetPoint(outcome.Cycle, _setup.Generators[g].Name, _outputs[g], outcome.End == CycleEnd.Settled));
    }

    private bool ReadLoads(int cycle)
    {
        if (_loadCycle == cycle)
            return true;
        _loadCycle = 0;
        if (!_loads.TryRead(cycle, _loadMw) || !AllFinite(_loadMw))
            return false;
        _loadCycle = cycle;
        return true;
    }

    private static bool AllFinite(double[] values) => Array.TrueForAll(values, double.IsFinite);

    private void Reply(Ask ask, long[] steps) => _out.Reply = new SiteReply.Answered(new Answer(ask.Id, ask.Everything, steps));

    private void Refuse(RoundId id, RefusalReason reason, string text) => _out.Reply = new SiteReply.Refused(new Refusal(id, reason, text));

    private static AskDigest DigestOf(Ask ask)
    {
        var bytes = new byte[1 + (16 * ask.Consensus.Length)];
        bytes[0] = ask.Everything ? (byte)1 : (byte)0;
        MemoryMarshal.AsBytes(ask.Consensus.AsSpan()).CopyTo(bytes.AsSpan(1));
        MemoryMarshal.AsBytes(ask.Dual.AsSpan()).CopyTo(bytes.AsSpan(1 + (8 * ask.Consensus.Length)));
        return AskDigest.Of(bytes);
    }

    private static RefusalReason ReasonOf(RoundRefusalReason reason) => reason switch
    {
        RoundRefusalReason.AskChanged => RefusalReason.AskChanged,
        RoundRefusalReason.Forfeited => RefusalReason.Forfeited,
        _ => RefusalReason.OutOfOrder,
    };

    private static string TextOf(RoundRefusalReason reason) => reason switch
    {
        RoundRefusalReason.AskChanged => "This round was asked before with other numbers; it has had its one answer.",
        RoundRefusalReason.Forfeited => "This round may have been answered before a restart; it is never answered again.",
        _ => "A later round was answered already.",
    };
}
