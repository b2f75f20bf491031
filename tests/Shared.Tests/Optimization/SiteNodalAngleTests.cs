using Halfvoice.Optimization;

namespace Halfvoice.Tests.Optimization;

public class SiteNodalAngleTests
{
    [Fact]
    public void A_one_bus_answer_meets_its_optimality_conditions_on_4000_random_sites()
    {
        int limited = 0, unserved = 0;
        for (var seed = 0; seed < 4000; seed++)
        {
            var instance = SiteInstances.Nodal(seed);
            var angles = new double[instance.Weights.Length];
            var solution = instance.Problem().Solve(instance.LoadMw, instance.AnchorRad, angles);
            limited += AssertOptimal(instance, solution, angles, seed) ? 1 : 0;
            unserved += solution.UnservedMw != 0 ? 1 : 0;
        }

        // The mix must exercise what it claims to: limits that bind, and load that cannot be served.
        Assert.InRange(limited, 1000, 3900);
        Assert.InRange(unserved, 200, 3000);
    }

    [Fact]
    public void The_answer_does_not_depend_on_what_was_asked_before()
    {
        var instance = SiteInstances.Nodal(11);
        var problem = instance.Problem();
        var first = new double[instance.Weights.Length];
        var again = new double[instance.Weights.Length];
        var before = problem.Solve(instance.LoadMw, instance.AnchorRad, first);
        var random = new Random(1);
        for (var k = 0; k < 100; k++)
            problem.Solve(1000 * random.NextDouble(), instance.AnchorRad.Select(a => a + random.NextDouble()).ToArray(), again);
        Assert.Equal(before, problem.Solve(instance.LoadMw, instance.AnchorRad, again));
        Assert.Equal(first, again);
    }

    [Fact]
    public void A_price_is_never_beyond_the_price_of_unserved_load()
    {
        var problem = new NodalAngleProblem(new SupplyCurve([]), [1e5, 1e5], [new NodalLine(1, 1000, 30)], 400);
        var angles = new double[2];
        var shed = problem.Solve(100, [0, 0], angles);
        Assert.Equal(400, shed.PricePerMwh);
        Assert.Equal(70, shed.UnservedMw, 1e-9);
        var spilt = problem.Solve(-100, [0, 0], angles);
        Assert.Equal(-400, spilt.PricePerMwh);
        Assert.Equal(-70, spilt.UnservedMw, 1e-9);
    }

    [Fact]
    public void A_solve_allocates_nothing()
    {
        var instance = SiteInstances.Nodal(3);
        var problem = instance.Problem();
        var supply = new SupplyCurve(instance.Generators);
        var outputs = new double[instance.Generators.Length];
        var angles = new double[instance.Weights.Length];
        problem.Solve(1, instance.AnchorRad, angles);
        supply.Respond(1, 1);
        supply.Split(1, outputs);
        var before = GC.GetAllocatedBytesForCurrentThread();
        for (var k = 0; k < 1000; k++)
        {
            problem.Solve(k, instance.AnchorRad, angles);
            supply.Respond(k, 0.1);
            supply.Split(k, outputs);
            InjectionProblem.Solve(supply, k, 2, 0.1, 3);
        }

        Assert.Equal(0, GC.GetAllocatedBytesForCurrentThread() - before);
    }

    [Fact]
    public void What_breaks_the_rules_is_refused()
    {
        var supply = new SupplyCurve([]);
        Assert.Throws<ArgumentException>(() => new NodalAngleProblem(supply, [], [], 1));
        Assert.Throws<ArgumentException>(() => new NodalAngleProblem(supply, [1, 0], [], 1));
        Assert.Throws<ArgumentException>(() => new NodalAngleProblem(supply, [1], [], 0));
        Assert.Throws<ArgumentException>(() => new NodalAngleProblem(supply, [1], [], double.PositiveInfinity));
        Assert.Throws<ArgumentException>(() => new NodalAngleProblem(supply, [1, 1], [new NodalLine(0, 1, 1)], 1));
        Assert.Throws<ArgumentException>(() => new NodalAngleProblem(supply, [1, 1], [new NodalLine(2, 1, 1)], 1));
        Assert.Throws<ArgumentException>(() => new NodalAngleProblem(supply, [1, 1], [new NodalLine(1, 0, 1)], 1));
        Assert.Throws<ArgumentException>(() => new NodalAngleProblem(supply, [1, 1], [new NodalLine(1, 1, -1)], 1));
        var problem = new NodalAngleProblem(supply, [1, 1], [new NodalLine(1, 1, 1)], 1);
        Assert.Throws<ArgumentException>(() => problem.Solve(1, [0], new double[2]));
        Assert.Throws<ArgumentException>(() => problem.Solve(1, [0, 0], new double[1]));
        Assert.Throws<ArgumentException>(() => problem.Solve(double.NaN, [0, 0], new double[2]));
        Assert.Throws<ArgumentException>(() => problem.Solve(1, [0, double.NaN], new double[2]));
    }

    /// <summary>
    /// Karush-Kuhn-Tucker conditions by line. With ν for the balance and a multiplier m_l, not 0 only at a limit and
    /// then of the flow's sign:  w_c (θ_c − a_c) = Σ_l∈c b_l (ν + m_l),  w_0 (θ_0 − a_0) + Σ_c w_c (θ_c − a_c) = 0,
    /// and the supply at ν. Returns whether any line stood at its limit.
    /// </summary>
    private static bool AssertOptimal(NodalInstance instance, NodalAngleSolution solution, double[] angles, int seed)
    {
        var outflow = 0.0;
        var limited = false;
        var pull = instance.Weights[0] * (angles[0] - instance.AnchorRad[0]);
        var scale = 1 + Math.Abs(pull);
        for (var c = 1; c < angles.Length; c++)
        {
            double susceptance = 0, size = 0;
            bool atLimit = false, atZero = false;
            foreach (var line in instance.Lines.Where(line => line.Copy == c))
            {
                var flow = line.SusceptanceMwPerRad * (angles[0] - angles[c]);
                var slack = 1e-8 * (1 + line.LimitMw);
                Assert.True(Math.Abs(flow) <= line.LimitMw + slack, $"seed {seed}: flow {flow} over {line.LimitMw}");
                outflow += flow;
                susceptance += line.SusceptanceMwPerRad;
                size += Math.Abs(line.SusceptanceMwPerRad);
                atLimit |= Math.Abs(flow) >= line.LimitMw - slack;
                atZero |= line.LimitMw == 0;
            }

            var own = instance.Weights[c] * (angles[c] - instance.AnchorRad[c]);
            var left = own - (solution.PricePerMwh * susceptance);
            var tolerance = 1e-9 * (1 + Math.Abs(own) + instance.Weights[c] + (Math.Abs(solution.PricePerMwh) * size));
            if (!atLimit)
                Assert.True(Math.Abs(left) <= tolerance, $"seed {seed}: copy {c} is off by {left}");
            else if (!atZero)
                Assert.True(left * Math.Sign(angles[0] - angles[c]) >= -tolerance, $"seed {seed}: limit at copy {c} pulls");
            limited |= atLimit;
            pull += own;
            scale += Math.Abs(own) + instance.Weights[c];
        }

        Assert.True(Math.Abs(pull) <= 1e-9 * scale, $"seed {seed}: the own angle is off by {pull}");
        AssertBalance(instance, solution, outflow, seed);
        return limited;
    }

    private static void AssertBalance(NodalInstance instance, NodalAngleSolution solution, double outflow, int seed)
    {
        var price = solution.PricePerMwh;
        var slackMw = 1e-8 * (1 + Math.Abs(instance.LoadMw) + Math.Abs(outflow));
        var gap = solution.OutputMw - instance.LoadMw + solution.UnservedMw - outflow;
        Assert.True(Math.Abs(gap) <= slackMw, $"seed {seed}: balance is off by {gap}");
        var (least, most) = SiteConditions.SupplyAround(instance.Generators, price, 1e-8 * (1 + Math.Abs(price)));
        Assert.True(
            solution.OutputMw >= least - slackMw && solution.OutputMw <= most + slackMw,
            $"seed {seed}: output {solution.OutputMw} is not in [{least}, {most}] at price {price}");
        Assert.InRange(price, -SiteInstances.UnservedPrice, SiteInstances.UnservedPrice);
        if (solution.UnservedMw != 0)
            Assert.Equal(Math.Sign(solution.UnservedMw) * SiteInstances.UnservedPrice, price);
    }
}
