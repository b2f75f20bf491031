namespace Halfvoice.Coordination;

/// <summary>
/// When a cycle counts as settled: mismatch and price move are at or under the plan's limits, or under what noise alone
/// leaves of them where that is more. Only released values enter.
/// </summary>
public static class StopRule
{
    public static bool Settled(RoundMeasure measure, CoordinatorSetup setup) =>
        measure.MismatchMw <= Math.Max(setup.MismatchLimitMw, measure.MismatchFloorMw)
        && measure.PriceMovePerMwh <= Math.Max(setup.PriceMoveLimitPerMwh, measure.PriceFloorPerMwh);
}
