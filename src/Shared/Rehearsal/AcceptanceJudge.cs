using Halfvoice.Plans;

namespace Halfvoice.Rehearsal;

/// <summary>Judges what was measured by the plan's acceptance limits.</summary>
public static class AcceptanceJudge
{
    // Balancing an exact dispatch leaves this much of rounding, MW.
    private const double ReserveToleranceMw = 1e-6;

    // An optimum at a line's limit may be over it by rounding alone, as a fraction.
    private const double LoadingTolerance = 1e-6;

    /// <summary>The time within which a cycle must settle, s: the plan's, or the interval less 60 s, at least half of it.</summary>
    public static double SettleWithinSeconds(Plan plan) =>
        (plan.Accept.SettleWithin ?? Longer(plan.Interval - TimeSpan.FromSeconds(60), plan.Interval / 2)).TotalSeconds;

    /// <summary>All limits that the plan sets or that have a default.</summary>
    public static IReadOnlyList<LimitResult> Judge(Plan plan, IReadOnlyList<CycleResult> cycles)
    {
        var accept = plan.Accept;
        var limits = new List<LimitResult>
        {
            Settling(plan, cycles),
            Limit("cost_gap", accept.CostGapFraction, Largest(cycles, c => c.CostGap), "fraction", 0),
            Limit("line_loading", accept.LineLoadingFraction, Largest(cycles, c => c.WorstLoading), "fraction", LoadingTolerance),
        };
        if (accept.ReserveMw is { } reserve)
            limits.Add(Limit("reserve_mw", reserve, Largest(cycles, c => c.ReserveMw), "MW", ReserveToleranceMw));
        if (accept.EpsilonPerDay is { } epsilon)
            limits.Add(Limit("epsilon_per_day", epsilon, EpsilonPerDay(plan, cycles), "epsilon", 1e-9 * epsilon));
        return limits;
    }

    /// <summary>
    /// Privacy loss of the worst site in a day of cycles like the dearest one seen (basic composition, δ = 0); null where no
    /// guarantee is given.
    /// </summary>
    public static double? EpsilonPerDay(Plan plan, IReadOnlyList<CycleResult> cycles)
    {
        if (plan.Privacy.Mechanism == MechanismKind.None || cycles.Count == 0)
            return null;
        var cyclesPerDay = Math.Ceiling(TimeSpan.FromDays(1) / plan.Interval);
        return cycles.SelectMany(c => c.EpsilonBySite.Values).DefaultIfEmpty(0).Max() * cyclesPerDay;
    }

    private static LimitResult Settling(Plan plan, IReadOnlyList<CycleResult> cycles)
    {
        var within = SettleWithinSeconds(plan);
        double? longest = cycles.Count > 0 && cycles.All(c => c.Settled) ? cycles.Max(c => c.Seconds) : null;
        return Limit("settle_within", within, longest, "s", 0);
    }

    private static LimitResult Limit(string name, double limit, double? measured, string unit, double tolerance) =>
        new(name, limit, measured, unit, measured is { } value && value <= limit + tolerance);

    private static double? Largest(IReadOnlyList<CycleResult> cycles, Func<CycleResult, double?> pick) =>
        cycles.Count > 0 && cycles.All(c => pick(c) is not null) ? cycles.Max(c => pick(c)!.Value) : null;

    private static TimeSpan Longer(TimeSpan a, TimeSpan b) => a > b ? a : b;
}
