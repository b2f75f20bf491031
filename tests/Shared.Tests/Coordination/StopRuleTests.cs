using Halfvoice.Coordination;

namespace Halfvoice.Tests.Coordination;

/// <summary>Both limits must be met, or the noise floor where that is higher.</summary>
public class StopRuleTests
{
    // Limits of the small plan: 0.5 % of 100 MW, and 0.05 $/MWh.
    [Theory]
    [InlineData(0.5, 0.05, 0, 0, true)]
    [InlineData(0.501, 0.05, 0, 0, false)]
    [InlineData(0.5, 0.0501, 0, 0, false)]
    [InlineData(0.501, 0.05, 0.6, 0, true)]
    [InlineData(0.501, 0.06, 0.6, 0, false)]
    [InlineData(0.5, 0.0501, 0.1, 0.06, true)]
    [InlineData(0.61, 0.01, 0.6, 9, false)]
    [InlineData(0.3, 0.01, 0.1, 0.001, true)]
    public void A_round_is_settled_only_under_both_limits(double mismatch, double move, double mismatchFloor, double priceFloor, bool settled)
    {
        var setup = new SetupBuilder(SmallPlan.Of(2, 1)).Coordinator;
        Assert.Equal(settled, StopRule.Settled(new RoundMeasure(mismatch, move, mismatchFloor, priceFloor, 1), setup));
    }
}
