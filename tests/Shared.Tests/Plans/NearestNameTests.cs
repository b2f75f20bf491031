namespace Halfvoice.Tests.Plans;

public class NearestNameTests
{
    [Theory]
    [InlineData("epsilom: 1", "epsilon")]
    [InlineData("espilon: 1", "epsilon")]
    [InlineData("Epsilon: 1", "epsilon")]
    [InlineData("epsiln: 1", "epsilon")]
    [InlineData("adjacency: 1", "adjacency_mw")]
    [InlineData("mechansim: none", "mechanism")]
    public void A_slip_is_answered_with_the_key_that_was_meant(string entry, string meant)
    {
        var error = new PlanTexts().With("plan.yaml", $"name: Small\nbase_mva: 100\nprivacy: {{ {entry} }}\n").OnlyError();
        Assert.EndsWith($"did you mean '{meant}'?", error, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("zzzzzzz: 1")]
    [InlineData("x: 1")]
    public void What_is_near_to_nothing_gets_the_list_of_known_keys(string entry)
    {
        var error = new PlanTexts().With("plan.yaml", $"name: Small\nbase_mva: 100\nprivacy: {{ {entry} }}\n").OnlyError();
        Assert.EndsWith("known here are mechanism, noise, adjacency_mw, epsilon, delta, scope", error, StringComparison.Ordinal);
    }
}
