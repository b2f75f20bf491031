using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

public class InjectionSensitivityTests
{
    /// <summary>
    /// A brute-force solver (ternary search on the convex objective in the total output, generators filled by merit) on
    /// random sites and adversarial asks: no pair of loads passes the bound, and some touch it.
    /// </summary>
    [Fact]
    public void No_ask_makes_an_injection_move_further_than_the_load()
    {
        var random = new Random(21);
        var worst = 0.0;
        for (var trial = 0; trial < 3_000; trial++)
        {
            var count = random.Next(0, 4);
            var plants = Enumerable.Range(0, count).Select(_ =>
            {
                var least = random.NextDouble() * 20;
                var most = least + random.NextDouble() * 50;
                return (Min: least, Max: most, A: random.Next(2) * random.NextDouble(), B: random.NextDouble() * 60);
            }).ToArray();
            var (u, z) = (random.NextDouble() * 200 - 100, random.NextDouble() * 200 - 100);
            var penalty = Math.Pow(10, random.NextDouble() * 4 - 2);
            var load = random.NextDouble() * 100;
            var other = load + random.NextDouble() * 2 - 1;
            var moved = Solve(plants, u, z, penalty, other) - Solve(plants, u, z, penalty, load);
            var ratio = -moved / (other - load);
            Assert.InRange(ratio, -1e-6, 1 + 1e-6);
            worst = Math.Max(worst, ratio);
        }

        Assert.True(worst > 1 - 1e-6);
        Assert.Equal(0.3, InjectionSensitivity.For(0.3).L1);
        Assert.Equal("the load change itself", InjectionSensitivity.For(0.3).Words);
    }

    [Theory]
    [InlineData(0)]
    [InlineData(-1)]
    [InlineData(double.NaN)]
    [InlineData(double.PositiveInfinity)]
    public void An_adjacency_out_of_range_is_refused(double adjacencyMw) =>
        Assert.Throws<ArgumentOutOfRangeException>(() => InjectionSensitivity.For(adjacencyMw));

    /// <summary>x = p − d with p the root of the marginal balance: each plant's output at a price λ is clamp((λ − B)/2A).</summary>
    private static double Solve((double Min, double Max, double A, double B)[] plants, double u, double z, double penalty, double load)
    {
        var least = plants.Sum(g => g.Min);
        var most = plants.Sum(g => g.Max);

        // The price that the ask offers for total output P is −u − ρ(P − load − z); it falls with P, marginal cost rises.
        for (var i = 0; i < 200; i++)
        {
            var middle = (least + most) / 2;
            var offered = -u - penalty * (middle - load - z);
            if (OutputAtMost(plants, offered) >= middle)
                least = middle;
            else
                most = middle;
        }

        return (least + most) / 2 - load;
    }

    private static double OutputAtMost((double Min, double Max, double A, double B)[] plants, double price) =>
        plants.Sum(g => g.A == 0 ? (price >= g.B ? g.Max : g.Min) : Math.Clamp((price - g.B) / (2 * g.A), g.Min, g.Max));
}
