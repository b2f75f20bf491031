using Halfvoice.Plans;
using Halfvoice.Rig.Runs;

namespace Halfvoice.Tests.Commands;

public class PlanPreviewTests
{
    /// <summary>Adjacency 0.1 MW at an epsilon of 3 over the cap: scale cap / 30 MW, against a reference load of some 100 MW.</summary>
    [Theory]
    [InlineData(30, false)]
    [InlineData(2000, true)]
    public void A_cap_that_leaves_each_answer_next_to_no_allowance_is_warned_of(int roundCap, bool warned)
    {
        var plan = InventedPlans.Make(5, 1);
        plan = plan with { Stop = plan.Stop with { RoundCap = roundCap } };
        var warnings = PlanPreview.Of(plan).Warnings(plan).ToArray();
        Assert.Equal(warned, warnings.Any(text => text.StartsWith("the noise on one answer of ", StringComparison.Ordinal)));
    }
}
