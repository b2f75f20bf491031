using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Tests.Optimization;

public class SiteSupplyCurveTests
{
    /// <summary>
    /// Optimality, from the definition: P is best for c(P) + ρ/2 (P − t)² exactly when, at the price ν = ρ (t − P), the
    /// generators' own cheapest outputs can add up to P, or P stands at an end and the price presses outwards.
    /// </summary>
    [Fact]
    public void A_response_meets_its_optimality_conditions_on_4000_random_sites()
    {
        for (var seed = 0; seed < 4000; seed++)
        {
            var random = new Random(seed);
            var generators = SiteInstances.Generators(random, 6);
            var supply = new SupplyCurve(generators);
            var penalty = SiteInstances.LogUniform(random, 1e-3, 10);
            var target = 4000 * (random.NextDouble() - 0.4);
            var response = supply.Respond(target, penalty);
            AssertOptimal(generators, response, penalty * (target - response), penalty, seed);
        }
    }

    [Fact]
    public void An_injection_is_the_minimum_of_its_objective_on_1000_random_sites()
    {
        for (var seed = 0; seed < 1000; seed++)
        {
            var random = new Random(seed);
            var generators = SiteInstances.Generators(random, 4);
            var supply = new SupplyCurve(generators);
            var penalty = SiteInstances.LogUniform(random, 1e-3, 10);
            var consensus = 600 * (random.NextDouble() - 0.5);
            var dual = 200 * (random.NextDouble() - 0.5);
            var load = 300 * (random.NextDouble() - 0.2);
            var injection = InjectionProblem.Solve(supply, consensus, dual, penalty, load);
            // Stationarity of c(P) + u x + ρ/2 (x − z)² in P: marginal cost = −u − ρ (x − z).
            AssertOptimal(generators, injection + load, -dual - (penalty * (injection - consensus)), penalty, seed);
        }
    }

    [Fact]
    public void A_split_adds_up_stays_within_limits_and_has_one_marginal_price_on_2000_random_sites()
    {
        for (var seed = 0; seed < 2000; seed++)
        {
            var random = new Random(seed);
            var generators = SiteInstances.Generators(random, 6);
            var supply = new SupplyCurve(generators);
            var total = supply.MinMw + (supply.RangeMw * ((1.4 * random.NextDouble()) - 0.2));
            var outputs = new double[generators.Length];
            supply.Split(total, outputs);
            Assert.Equal(Math.Clamp(total, supply.MinMw, supply.MaxMw), outputs.Sum(), 1e-9 * (1 + Math.Abs(total)));
            double lowestCouldRise = double.PositiveInfinity, highestCouldFall = double.NegativeInfinity;
            for (var g = 0; g < outputs.Length; g++)
            {
                Assert.InRange(outputs[g], generators[g].MinMw - 1e-9, generators[g].MaxMw + 1e-9);
                var marginal = generators[g].CostLinear + (2 * generators[g].CostQuadratic * outputs[g]);
                if (outputs[g] < generators[g].MaxMw - 1e-7)
                    lowestCouldRise = Math.Min(lowestCouldRise, marginal);
                if (outputs[g] > generators[g].MinMw + 1e-7)
                    highestCouldFall = Math.Max(highestCouldFall, marginal);
            }

            Assert.True(highestCouldFall <= lowestCouldRise + 1e-7, $"seed {seed}: shifting output would save money");
        }
    }

    [Fact]
    public void Generators_tied_at_the_price_share_in_proportion_to_their_range()
    {
        var supply = new SupplyCurve([Linear(0, 100, 20), Linear(50, 250, 20), Linear(0, 40, 10), Linear(0, 10, 30)]);
        var outputs = new double[4];
        supply.Split(40 + 50 + 150, outputs);
        Assert.Equal([50, 150, 40, 0], outputs, (a, b) => Math.Abs(a - b) < 1e-12);
    }

    [Fact]
    public void A_site_without_generators_answers_zero_and_fills_nothing()
    {
        var supply = new SupplyCurve([]);
        Assert.Equal(0, supply.Respond(123, 0.5));
        Assert.Equal(0, supply.RangeMw);
        Assert.Equal(-40, InjectionProblem.Solve(supply, 10, 3, 0.1, 40));
        supply.Split(17, []);
    }

    [Fact]
    public void Supply_at_a_tie_covers_the_whole_step()
    {
        var supply = new SupplyCurve([Linear(5, 25, 20), new Generator("q", 0, 0, 100, 0.1, 20)]);
        Assert.Equal(5, supply.Supply(20, tieHigh: false));
        Assert.Equal(25, supply.Supply(20, tieHigh: true));
        Assert.Equal(25 + 50, supply.Supply(30, tieHigh: true), 1e-12);
        Assert.Equal(5, supply.Supply(-1, tieHigh: true));
        Assert.Equal(125, supply.Supply(1e9, tieHigh: false));
    }

    [Fact]
    public void What_breaks_the_rules_is_refused()
    {
        Assert.Throws<ArgumentException>(() => new SupplyCurve([Linear(10, 9, 1)]));
        Assert.Throws<ArgumentException>(() => new SupplyCurve([Linear(0, double.PositiveInfinity, 1)]));
        Assert.Throws<ArgumentException>(() => new SupplyCurve([new Generator("g", 0, 0, 1, -0.1, 1)]));
        Assert.Throws<ArgumentException>(() => new SupplyCurve([Linear(0, 1, double.NaN)]));
        var supply = new SupplyCurve([Linear(0, 1, 1)]);
        Assert.Throws<ArgumentOutOfRangeException>(() => supply.Respond(1, 0));
        Assert.Throws<ArgumentOutOfRangeException>(() => supply.Respond(double.NaN, 1));
        Assert.Throws<ArgumentException>(() => supply.Split(1, new double[2]));
        Assert.Throws<ArgumentException>(() => supply.Split(double.NaN, new double[1]));
    }

    private static void AssertOptimal(Generator[] generators, double totalMw, double price, double penalty, int seed)
    {
        var tolerance = 1e-9 * (1 + Math.Abs(price) + (penalty * Math.Abs(totalMw)));
        var (least, most) = SiteConditions.SupplyAround(generators, price, tolerance);
        var slackMw = 1e-9 * (1 + Math.Abs(totalMw));
        Assert.True(totalMw >= least - slackMw && totalMw <= most + slackMw, $"seed {seed}: {totalMw} is not in [{least}, {most}]");
    }

    private static Generator Linear(double min, double max, double price) => new("g", 0, min, max, 0, price);
}
