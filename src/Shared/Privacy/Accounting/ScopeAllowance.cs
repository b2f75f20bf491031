using System.Numerics;
using Halfvoice.Plans;

namespace Halfvoice.Privacy;

/// <summary>
/// How a plan's ε is shared out among answers by basic composition: the period's allowance divided by the most answers
/// that the period can hold, in whole units and rounded down.
/// </summary>
public sealed record ScopeAllowance
{
    private ScopeAllowance(PrivacyScope scope, long statedUnits, int answersPerCycle, long cyclesPerDay, long campaignCycles)
    {
        Scope = scope;
        StatedUnits = statedUnits;
        AnswersPerCycle = answersPerCycle;
        CyclesPerDay = cyclesPerDay;
        CampaignCycles = campaignCycles;
        EpsilonUnitsEach = statedUnits / AnswersSharing;
        if (EpsilonUnitsEach < 1)
            throw new ArgumentException("privacy.epsilon is too small for so many answers: less than 1e-12 is left for each.");
    }

    public PrivacyScope Scope { get; }

    /// <summary>The plan's ε in units.</summary>
    public long StatedUnits { get; }

    /// <summary>Most answers of the site in a cycle: the round cap, or 1 for a site that answers once a cycle.</summary>
    public int AnswersPerCycle { get; }

    /// <summary>Cycles in 24 h, rounded up.</summary>
    public long CyclesPerDay { get; }

    public long CampaignCycles { get; }

    /// <summary>ε of one answer in units.</summary>
    public long EpsilonUnitsEach { get; }

    /// <summary>Answers that share the stated ε.</summary>
    public long AnswersSharing => Scope switch
    {
        PrivacyScope.Round => 1,
        PrivacyScope.Cycle => AnswersPerCycle,
        PrivacyScope.Day => checked(AnswersPerCycle * CyclesPerDay),
        PrivacyScope.Campaign => checked(AnswersPerCycle * CampaignCycles),
        _ => throw new InvalidOperationException($"The scope {Scope} has no allowance."),
    };

    /// <summary>
    /// What a period may spend, in units. Under scope round each answer has an allowance of its own, which it cannot pass
    /// because no round is granted twice; the book then keeps the sum over a cycle.
    /// </summary>
    public BigInteger PeriodUnits => Scope == PrivacyScope.Round ? (BigInteger)StatedUnits * AnswersPerCycle : StatedUnits;

    /// <summary>ε of one answer, of a cycle in which every answer is given, of a day and of the campaign of such cycles.</summary>
    public decimal EpsilonPerAnswer => EpsilonUnits.ToDecimal(EpsilonUnitsEach);

    /// <inheritdoc cref="EpsilonPerAnswer"/>
    public decimal EpsilonPerCycle => EpsilonUnits.ToDecimal((BigInteger)EpsilonUnitsEach * AnswersPerCycle);

    /// <inheritdoc cref="EpsilonPerAnswer"/>
    public decimal EpsilonPerDay => EpsilonUnits.ToDecimal((BigInteger)EpsilonUnitsEach * AnswersPerCycle * CyclesPerDay);

    /// <inheritdoc cref="EpsilonPerAnswer"/>
    public decimal EpsilonPerCampaign => EpsilonUnits.ToDecimal((BigInteger)EpsilonUnitsEach * AnswersPerCycle * CampaignCycles);

    /// <param name="privacy">Scope and ε.</param>
    /// <param name="roundCap">The plan's hard cap on rounds, at least 1.</param>
    /// <param name="interval">Length of a dispatch interval, above 0, at most 24 h.</param>
    /// <param name="campaignCycles">Cycles of the campaign, at least 1.</param>
    /// <param name="answersOnce">True for a site without adjustable plant, which answers once a cycle and is data from then on.</param>
    public static ScopeAllowance For(PrivacySettings privacy, int roundCap, TimeSpan interval, int campaignCycles, bool answersOnce)
    {
        ArgumentNullException.ThrowIfNull(privacy);
        ArgumentOutOfRangeException.ThrowIfLessThan(roundCap, 1);
        ArgumentOutOfRangeException.ThrowIfLessThan(campaignCycles, 1);
        if (interval <= TimeSpan.Zero || interval > TimeSpan.FromDays(1))
            throw new ArgumentOutOfRangeException(nameof(interval), "The interval must be above 0 and at most 24 h.");
        var cyclesPerDay = (TimeSpan.TicksPerDay + interval.Ticks - 1) / interval.Ticks;
        return new ScopeAllowance(
            privacy.Scope, EpsilonUnits.Allowance(privacy.Epsilon), answersOnce ? 1 : roundCap, cyclesPerDay, campaignCycles);
    }

    /// <summary>The period that a cycle (1-based) falls into.</summary>
    public PrivacyPeriod PeriodOf(int cycle)
    {
        ArgumentOutOfRangeException.ThrowIfLessThan(cycle, 1);
        return new PrivacyPeriod(Scope, Scope switch
        {
            PrivacyScope.Campaign => 1,
            PrivacyScope.Day => (cycle - 1) / CyclesPerDay + 1,
            _ => cycle,
        });
    }
}
