using System.Numerics;
using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Privacy;

namespace Halfvoice.Tests.Coordination;

/// <summary>A site that may die at any step. What it stored survives; what it sent is remembered and compared.</summary>
internal sealed class LossySite : ILoadReadings
{
    private readonly SiteSetup _setup;
    private readonly LoadSeries _loads;
    private readonly ulong _seed;
    private readonly ScopeAllowance? _allowance;
    private readonly bool _answersOnce;
    private readonly Dictionary<RoundId, Answer> _sent = [];
    private readonly Dictionary<int, long[]> _onceByCycle = [];
    private ulong _starts;

    public LossySite(SiteSetup setup, LoadSeries loads, ulong seed)
    {
        _setup = setup;
        _loads = loads;
        _seed = seed;
        Core = Start();
        _allowance = Core.Privacy.Allowance;
        _answersOnce = SiteSchemes.Create(setup).Adjustable.Count == 0;
    }

    public SiteCore Core { get; private set; }

    /// <summary>Number of the stream that is open; a message of an earlier one is lost.</summary>
    public int Stream { get; set; }

    public SortedDictionary<long, ChargeRow> Ledger { get; } = [];

    public int AnswersSent => _sent.Count;

    public int Repeats { get; private set; }

    public int SetPoints { get; private set; }

    public Dictionary<RefusalReason, int> Refusals { get; } = [];

    public bool TryRead(int cycle, Span<double> loadMw)
    {
        _loads.At(cycle).CopyTo(loadMw);
        return true;
    }

    /// <param name="input">One input.</param>
    /// <param name="storesFirst">False where the site dies before it has stored anything.</param>
    /// <param name="sends">False where it dies before the reply leaves.</param>
    public SiteReply? Step(SiteInput input, bool storesFirst, bool sends)
    {
        var step = Core.Step(input, TimeSpan.FromSeconds(1));
        if (!storesFirst)
            return null;
        foreach (var row in step.Charges)
            Store(row);
        foreach (var point in step.SetPoints)
            CheckSetPoint(point);
        var reply = step.Reply;
        if (!sends)
            return null;
        if (reply is SiteReply.Answered answered)
            CheckAnswer(answered.Answer);
        else if (reply is SiteReply.Refused refused)
            Refusals[refused.Refusal.Reason] = Refusals.GetValueOrDefault(refused.Refusal.Reason) + 1;
        Core.PrepareNoise();
        return reply;
    }

    public void Restart() => Core = Start();

    private SiteCore Start()
    {
        var core = new SiteCore(_setup, this, new SeededNoiseSource(_seed, ++_starts), Ledger.Values, out var forfeited);
        foreach (var row in forfeited)
            Store(row);
        return core;
    }

    /// <summary>Spent never exceeds the allowance, whatever row was just stored; a closed row never opens again.</summary>
    private void Store(ChargeRow row)
    {
        if (Ledger.TryGetValue(row.Id, out var old))
            Assert.True(old == row || old.State == ChargeState.Open, "A closed row of the ledger was changed.");
        Ledger[row.Id] = row;
        var spent = Ledger.Values.Where(r => r.Period == row.Period)
            .Aggregate(BigInteger.Zero, (sum, r) => sum + ((BigInteger)r.ChargedAnswers * r.EpsilonUnitsEach));
        Assert.True(spent <= _allowance!.PeriodUnits, "More was spent than the allowance.");
    }

    private void CheckAnswer(Answer answer)
    {
        if (_sent.TryGetValue(answer.Id, out var before))
        {
            Repeats++;
            Assert.Equal(before.Steps, answer.Steps);
            Assert.Equal(before.Everything, answer.Everything);
            return;
        }

        _sent.Add(answer.Id, answer);
        if (_allowance is null)
            return;
        // Numbers released already tell nothing new; after a restart there may be others, with a charge of their own.
        if (_answersOnce && _onceByCycle.TryGetValue(answer.Id.Cycle, out var released) && released.SequenceEqual(answer.Steps))
            return;
        Assert.Contains(Ledger.Values, row => row.State == ChargeState.Open && row.Spans(answer.Id.Cycle, answer.Id.Round));
        if (_answersOnce)
            _onceByCycle[answer.Id.Cycle] = answer.Steps;
    }

    private void CheckSetPoint(SetPoint point)
    {
        SetPoints++;
        var plant = _setup.Generators.Single(g => g.Name == point.Generator);
        Assert.InRange(point.Mw, plant.MinMw - 1e-6, plant.MaxMw + 1e-6);
    }
}
