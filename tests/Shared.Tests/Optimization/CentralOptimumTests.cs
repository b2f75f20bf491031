using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Tests.Optimization;

public class CentralOptimumTests
{
    [Theory]
    [InlineData("ieee-14")]
    [InlineData("ieee-118")]
    [InlineData("ieee-118-areas")]
    public void Published_cost_is_met_to_five_digits(string name)
    {
        var (network, load, cost) = CentralCases.Read(name);
        var optimum = CentralOptimum.Solve(network, load);
        CentralCertificate.Holds(network, load, optimum);
        Assert.Equal(cost, optimum.CostPerHour, 0.5e-4 * cost);
        Assert.InRange(optimum.RelativeGap, -1e-10, 1e-8);
    }

    /// <summary>
    /// The PJM five-bus system as Li and Bo use it ("Small test systems for power system economic studies", IEEE PES General Meeting 2010,
    /// from memory): Solitude at 30 and Sundance at 40 $/MWh, 300/300/400 MW at B, C and D, the line D-E at its 240 MW.
    /// </summary>
    [Fact]
    public void The_five_bus_system_has_its_published_dispatch_and_prices()
    {
        Bus[] buses = [new("A", "A"), new("B", "B"), new("C", "C"), new("D", "D"), new("E", "E")];
        Line[] lines =
        [
            new("A-B", 0, 1, 0.0281, 400), new("A-D", 0, 3, 0.0304), new("A-E", 0, 4, 0.0064),
            new("B-C", 1, 2, 0.0108), new("C-D", 2, 3, 0.0297), new("D-E", 3, 4, 0.0297, 240),
        ];
        Generator[] plants =
        [
            new("Alta", 0, 0, 40, 0, 14), new("Park City", 0, 0, 170, 0, 15), new("Solitude", 2, 0, 520, 0, 30),
            new("Sundance", 3, 0, 200, 0, 40), new("Brighton", 4, 0, 600, 0, 10),
        ];
        var network = new Network(100, buses, lines, plants);
        double[] load = [0, 300, 300, 400, 0];
        var optimum = CentralOptimum.Solve(network, load);
        CentralCertificate.Holds(network, load, optimum);
        Assert.Equal(17479.9, optimum.CostPerHour, 0.05);
        double[] dispatch = [40, 170, 323.49, 0, 466.51];
        double[] price = [16.98, 26.38, 30, 39.94, 10];
        for (var g = 0; g < dispatch.Length; g++)
            Assert.Equal(dispatch[g], optimum.DispatchMw[g], 0.005);
        for (var i = 0; i < price.Length; i++)
            Assert.Equal(price[i], optimum.PricePerMwh[i], 0.005);
        Assert.Equal(-240, optimum.FlowMw[5], 1e-6);
        Assert.True(optimum.LinePricePerMwh[5] > 1);
    }

    /// <summary>400 networks, seeds 0 to 399, against a simplex method; the infeasible ones must leave as many MW unserved.</summary>
    [Fact]
    public void Linear_costs_agree_with_a_simplex_method()
    {
        int served = 0, unserved = 0;
        for (var seed = 0; seed < 400; seed++)
        {
            var (network, load) = CentralNetworks.Random(new Random(seed), quadratic: false, tightness: seed % 3 == 0 ? 2 : 1);
            var optimum = CentralOptimum.Solve(network, load);
            var reference = CentralLinearProgram.Cheapest(network, load);
            if (!reference.Solved)
            {
                var least = CentralLinearProgram.LeastUnservedMw(network, load);
                Assert.True(OptimumStatus.Infeasible == optimum.Status, $"seed {seed}: {optimum.Status}, {least} MW unserved");
                Assert.Equal(least, optimum.Infeasibility!.UnservedMw, 1e-5 * Math.Max(1, least));
                Assert.NotEmpty(optimum.Infeasibility.Describe(network));
                unserved++;
                continue;
            }

            Assert.True(OptimumStatus.Optimal == optimum.Status, $"seed {seed}: {optimum.Status}");
            CentralCertificate.Holds(network, load, optimum);
            Assert.Equal(reference.CostPerHour, optimum.CostPerHour, 1e-8 * Math.Max(1, Math.Abs(reference.CostPerHour)));
            served++;
        }

        Assert.True(served >= 200 && unserved >= 10, $"{served} served, {unserved} not");
    }

    [Fact]
    public void Mixed_costs_meet_the_optimality_conditions()
    {
        var served = 0;
        for (var seed = 1000; seed < 1150; seed++)
        {
            var (network, load) = CentralNetworks.Random(new Random(seed), quadratic: true);
            var optimum = CentralOptimum.Solve(network, load);
            if (optimum.Status == OptimumStatus.Infeasible)
            {
                Assert.True(CentralLinearProgram.LeastUnservedMw(network, load) > 1e-6);
                continue;
            }

            Assert.True(OptimumStatus.Optimal == optimum.Status, $"seed {seed}: {optimum.Status}");
            CentralCertificate.Holds(network, load, optimum);
            served++;
        }

        Assert.True(served >= 50, $"only {served} could be served");
    }

    /// <summary>Large enough for the ordering, the sparse factor and many binding lines to matter: a ladder of 1,500 buses.</summary>
    [Fact]
    public void A_large_network_meets_the_optimality_conditions()
    {
        var random = new Random(11);
        const int Length = 500;
        var buses = Enumerable.Range(0, 3 * Length).Select(i => new Bus($"B{i}", $"S{i}")).ToArray();
        var lines = new List<Line>();
        for (var i = 0; i < buses.Length; i++)
        {
            if (i % 3 != 2)
                lines.Add(new Line($"R{i}", i, i + 1, 0.02 + (0.1 * random.NextDouble()), 20 + (40 * random.NextDouble())));
            if (i + 3 < buses.Length)
                lines.Add(new Line($"P{i}", i, i + 3, 0.02 + (0.1 * random.NextDouble()), 30 + (60 * random.NextDouble())));
        }

        var load = buses.Select(_ => 30 * random.NextDouble()).ToArray();
        var plants = Enumerable.Range(0, 400).Select(g => new Generator(
            $"G{g}", random.Next(buses.Length), 0, 50 + (100 * random.NextDouble()), g % 2 == 0 ? 0 : 0.1 * random.NextDouble(),
            10 + (40 * random.NextDouble()))).ToArray();
        var dear = buses.Select((_, i) => new Generator($"D{i}", i, 0, 40, 0, 200));
        var network = new Network(100, buses, lines, [.. plants, .. dear]);
        var optimum = CentralOptimum.Solve(network, load);
        CentralCertificate.Holds(network, load, optimum);
        Assert.True(optimum.LinePricePerMwh.Count(price => price > 1e-3) > 50);
    }
}
