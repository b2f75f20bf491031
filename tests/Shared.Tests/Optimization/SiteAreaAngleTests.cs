using Halfvoice.Optimization;

namespace Halfvoice.Tests.Optimization;

public class SiteAreaAngleTests
{
    [Fact]
    public void An_area_answer_meets_its_optimality_conditions_on_2000_random_sites()
    {
        int limited = 0, unserved = 0, islands = 0, steps = 0;
        for (var seed = 0; seed < 2000; seed++)
        {
            var instance = AreaInstance.From(seed);
            var answer = AreaAnswer.Of(new AreaAngleProblem(instance.Model), instance);
            limited += SiteAreaConditions.Check(instance, answer, $"seed {seed}") > 0 ? 1 : 0;
            unserved += answer.Solution.ShedMw + answer.Solution.SpiltMw > 0 ? 1 : 0;
            islands += instance.AnchorRad.Length == 0 ? 1 : 0;
            steps = Math.Max(steps, answer.Solution.OuterSteps);
        }

        Assert.InRange(limited, 500, 1950);
        Assert.InRange(unserved, 200, 1800);
        Assert.InRange(islands, 200, 800);
        TestContext.Current.TestOutputHelper!.WriteLine($"limited {limited} unserved {unserved} islands {islands} steps {steps}");
    }

    [Fact]
    public void A_site_of_one_bus_gets_the_answer_of_the_one_bus_problem()
    {
        for (var seed = 0; seed < 1000; seed++)
        {
            var nodal = SiteInstances.Nodal(seed);
            var expected = new double[nodal.Weights.Length];
            var one = nodal.Problem().Solve(nodal.LoadMw, nodal.AnchorRad, expected);
            var area = AreaInstance.From(nodal);
            var many = AreaAnswer.Of(new AreaAngleProblem(area.Model), area);
            for (var c = 0; c < expected.Length; c++)
                Assert.True(Math.Abs(expected[c] - many.CopiesRad[c]) <= 1e-7, $"seed {seed}: copy {c}, {expected[c]} and {many.CopiesRad[c]}");
            var tolerance = 1e-6 * (1 + Math.Abs(nodal.LoadMw));
            Assert.True(Math.Abs(one.OutputMw - many.OutputMw.Sum()) <= tolerance, $"seed {seed}: {one} and {many.OutputMw.Sum()}");
            Assert.True(Math.Abs(one.UnservedMw - many.UnservedMw[0]) <= tolerance, $"seed {seed}: {one} and {many.UnservedMw[0]}");
        }
    }
}
