using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

public class AreaAngleSensitivityTests
{
    private const double NoPriceBound = 1e18;

    private static double Moved(AreaAngleProblem problem, double[] from, double[] to) =>
        problem.Solve(from).Zip(problem.Solve(to), (x, y) => Math.Abs(x - y)).Sum();

    /// <summary>
    /// Every active set of a small area is made the solution of an ask, and one load is moved: no response passes the bound,
    /// and the worst of them is the bound.
    /// </summary>
    [Theory]
    [InlineData(1)]
    [InlineData(2)]
    [InlineData(3)]
    public void The_bound_is_the_worst_response_over_designed_active_sets(int seed)
    {
        var random = new Random(seed);
        var lines = new (int From, int To)[] { (0, 1), (0, 2), (0, 3), (1, 3), (1, 4) };
        var b = lines.Select(_ => 20 + 80 * random.NextDouble()).ToArray();
        var weights = Enumerable.Range(0, 5).Select(_ => 1_000 * Math.Pow(10, random.NextDouble() - 0.5)).ToArray();
        var worst = 0.0;
        var bound = 0.0;
        for (var held = 0; held < 1 << lines.Length; held++)
        {
            for (var marginal = 0; marginal < 3; marginal++)
            {
                var (problem, load) = Designed(random, lines, b, weights, held, marginal);
                bound = AngleSensitivity.For(problem.Shape(NoPriceBound), 1).L1;
                for (var bus = 0; bus < 2; bus++)
                {
                    var moved = (double[])load.Clone();
                    moved[bus] += 0.1;
                    worst = Math.Max(worst, Moved(problem, load, moved) / 0.1);
                    Assert.True(problem.Error < 1e-11);
                }
            }
        }

        Assert.InRange(worst / bound, 1 - 1e-4, 1 + 1e-4);
    }

    /// <summary>
    /// An ask and loads whose solution has exactly these lines at their limit and these buses marginal: angles and prices
    /// are chosen, targets follow from stationarity, W·(θ − a) + Lᵀν + Σ ±b·λ = 0.
    /// </summary>
    private static (AreaAngleProblem, double[]) Designed(
        Random random, (int From, int To)[] ends, double[] b, double[] weights, int held, int marginal)
    {
        var angle = weights.Select(_ => random.NextDouble() * 0.4 - 0.2).ToArray();
        var price = new[] { random.NextDouble() * 50, random.NextDouble() * 50 };
        var pull = new double[weights.Length];
        var injection = new double[2];
        var lines = new (int, int, double, double)[ends.Length];
        for (var l = 0; l < ends.Length; l++)
        {
            var (from, to) = ends[l];
            var flow = b[l] * (angle[from] - angle[to]);
            var isHeld = ((held >> l) & 1) == 1;
            lines[l] = (from, to, b[l], Math.Abs(flow) + (isHeld ? 0 : 5));
            var force = isHeld ? Math.Sign(flow) * b[l] * (20 + 20 * random.NextDouble()) : 0;
            foreach (var (bus, other, sign) in new[] { (from, to, 1), (to, from, -1) })
            {
                pull[bus] += sign * force;
                if (bus >= 2)
                    continue;
                injection[bus] += sign * flow;
                pull[bus] += price[bus] * b[l];
                pull[other] -= price[bus] * b[l];
            }
        }

        var plants = Enumerable.Range(0, 2).Where(bus => ((marginal >> bus) & 1) == 1)
            .Select(bus => (bus, -5.0, 5.0, 0.0, price[bus])).ToArray();
        var problem = new AreaAngleProblem
        {
            OwnBuses = 2,
            Nodes = [.. weights.Select((w, node) => (w, angle[node] + pull[node] / w))],
            Lines = lines,
            Plants = plants,
            Unserved = 1_000,
        };
        return (problem, [.. injection.Select(x => -x)]);
    }

    /// <summary>Random areas with inner buses, meshes, parallel and capacitive lines, asks and loads: none passes the bound.</summary>
    [Fact]
    public void No_searched_ask_moves_an_area_s_angles_further_than_the_bound()
    {
        var random = new Random(41);
        var worst = 0.0;
        var unsolved = 0;
        for (var trial = 0; trial < 300; trial++)
        {
            var problem = Draw(random);
            var load = Enumerable.Range(0, problem.OwnBuses).Select(_ => random.NextDouble() * 60 - 20).ToArray();
            var move = load.Select(_ => random.NextDouble() - 0.5).ToArray();
            var size = (trial % 3 == 0 ? 10 : 0.05) / move.Sum(Math.Abs);
            var other = load.Zip(move, (d, m) => d + size * m).ToArray();
            var adjacency = load.Zip(other, (x, y) => Math.Abs(x - y)).Sum();
            var bound = AngleSensitivity.For(problem.Shape(NoPriceBound), adjacency);
            Assert.Equal(SensitivityMethod.EveryActiveSet, bound.Method);
            var price = AngleSensitivity.UnservedPriceOnly(problem.Shape(problem.Unserved), adjacency);
            var moved = Moved(problem, load, other);
            if (problem.Error > 1e-11)
            {
                unsolved++;
                continue;
            }

            Assert.True(moved <= bound.L1 * (1 + 1e-4) + 1e-7, $"Trial {trial} moved {moved:G6}, bound {bound.L1:G6}.");
            Assert.True(moved <= price.L1 * (1 + 1e-4) + 1e-7);
            worst = Math.Max(worst, moved / bound.L1);
        }

        Assert.True(unsolved <= 15, $"{unsolved} problems had no accurate solution.");
        Assert.True(worst > 0.5, $"The search came to {worst:P1} of the bound only.");
    }

    private static AreaAngleProblem Draw(Random random)
    {
        var own = random.Next(2, 4);
        var foreign = random.Next(1, 4);
        var ends = new List<(int, int)>();
        for (var i = 1; i < own; i++)
            ends.Add((random.Next(i), i));
        for (var f = 0; f < foreign; f++)
            ends.Add((random.Next(own), own + f));
        for (var extra = random.Next(0, 3); extra > 0; extra--)
        {
            var from = random.Next(own);
            ends.Add((from, (from + random.Next(1, own + foreign)) % (own + foreign)));
        }

        var border = ends.Where(e => e.Item2 >= own).Select(e => e.Item1).Concat(Enumerable.Range(own, foreign)).ToHashSet();
        return new AreaAngleProblem
        {
            OwnBuses = own,
            Nodes = [.. Enumerable.Range(0, own + foreign).Select(node => border.Contains(node)
                ? (500 * Math.Pow(10, random.NextDouble()), random.NextDouble() - 0.5)
                : (0.0, 0.0))],
            Lines = [.. ends.Select(e =>
            {
                var b = (20 + 100 * random.NextDouble()) * (random.Next(12) == 0 ? -1 : 1);
                return (e.Item1, e.Item2, b, random.Next(3) == 0 ? double.PositiveInfinity : 1 + 25 * random.NextDouble());
            })],
            Plants = [.. Enumerable.Range(0, own).Where(_ => random.Next(2) == 0).Select(bus =>
                (bus, 0.0, 40 * random.NextDouble(), random.Next(2) * 0.2, 40 * random.NextDouble()))],
            Unserved = 1_000,
        };
    }

    /// <summary>One own bus seen as an area gives what the one-bus formula gives.</summary>
    [Fact]
    public void An_area_whose_second_bus_hangs_on_nothing_is_a_one_bus_site()
    {
        double[] b = [30, 55, 80];
        var lines = b.Select((x, c) => new AngleSiteLine(0, c + 2, x, c != 1)).ToArray();
        var area = new AngleSiteShape(2, [3, 0, 4, 5, 6], lines, NoPriceBound);
        var alone = new AngleSiteShape(1, [3, 4, 5, 6], [.. lines.Select(l => l with { To = l.To - 1 })], NoPriceBound);
        Assert.Equal(1, AngleSensitivity.For(area, 1).L1 / AngleSensitivity.For(alone, 1).L1, 9);
    }

    /// <summary>An inner bus on a single line hands its load on unchanged, so it adds nothing to its neighbour's sensitivity.</summary>
    [Fact]
    public void An_inner_bus_on_one_line_counts_like_the_bus_it_hangs_on()
    {
        var tail = new AngleSiteShape(
            2, [3, 0, 4, 5], [new(0, 1, 77, true), new(0, 2, 30, true), new(0, 3, 55, true)], NoPriceBound);
        var alone = new AngleSiteShape(1, [3, 4, 5], [new(0, 1, 30, true), new(0, 2, 55, true)], NoPriceBound);
        Assert.Equal(1, AngleSensitivity.For(tail, 1).L1 / AngleSensitivity.For(alone, 1).L1, 9);
    }

    [Fact]
    public void A_contradiction_hidden_by_rounding_is_settled_exactly()
    {
        // 0.1 + 0.2 and 0.3 in parallel of either sign: not zero in floating point, nor exactly, so only the price bound is left.
        var almost = new AngleSiteShape(2, [1, 1, 1], [new(0, 2, 0.3, true), new(0, 2, -(0.1 + 0.2), true), new(1, 2, 1, true)], 100);
        Assert.Equal(SensitivityMethod.UnservedPrice, AngleSensitivity.For(almost, 1).Method);

        // Two buses held together and tied to one foreign bus alike: fixed at both they contradict each other exactly.
        var twin = new AngleSiteShape(2, [1, 1, 1], [new(0, 1, 5, true), new(0, 2, 0.1, true), new(1, 2, 0.3, true)], NoPriceBound);
        Assert.Equal(SensitivityMethod.EveryActiveSet, AngleSensitivity.For(twin, 1).Method);
    }

    [Fact]
    public void Sites_too_large_to_visit_every_set_get_the_price_bound()
    {
        var lines = Enumerable.Range(0, 17).Select(i => new AngleSiteLine(i % 2, 2 + i, 50, true)).ToArray();
        var large = new AngleSiteShape(2, [.. Enumerable.Repeat(1_000.0, 19)], lines, 100);
        var bound = AngleSensitivity.For(large, 1);
        Assert.Equal(SensitivityMethod.UnservedPrice, bound.Method);
        Assert.Equal(1, bound.L1 / Math.Sqrt(19 / 1_000.0 * 2 * 100), 5);
    }
}
