using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

public class OneBusAngleSensitivityTests
{
    private const double NoPriceBound = 1e18;

    private static AngleSiteShape Star(double[] susceptances, double[]? weights = null, bool limited = true, double price = NoPriceBound)
    {
        weights ??= [.. Enumerable.Repeat(1.0, susceptances.Length + 1)];
        var lines = susceptances.Select((b, c) => new AngleSiteLine(0, c + 1, b, limited)).ToArray();
        return new AngleSiteShape(1, weights, lines, price);
    }

    /// <summary>The closed form for equal weights, 2B/(B²/(1 + n − |U|) + Q), maximised over U by bit masks.</summary>
    private static double EqualWeights(double[] b)
    {
        var worst = 0.0;
        for (var mask = 1; mask < 1 << b.Length; mask++)
        {
            var free = b.Where((_, c) => ((mask >> c) & 1) == 1).ToArray();
            var sum = free.Sum();
            worst = Math.Max(worst, 2 * sum / (sum * sum / (1 + b.Length - free.Length) + free.Sum(x => x * x)));
        }

        return worst;
    }

    [Fact]
    public void Equal_weights_give_the_closed_form_whatever_the_weight()
    {
        var random = new Random(31);
        for (var trial = 0; trial < 200; trial++)
        {
            var b = Enumerable.Range(0, random.Next(1, 9)).Select(_ => 1 + 99 * random.NextDouble()).ToArray();
            var weight = Math.Pow(10, random.NextDouble() * 6 - 3);
            var bound = AngleSensitivity.For(Star(b, [.. Enumerable.Repeat(weight, b.Length + 1)]), 0.5);
            Assert.Equal(SensitivityMethod.EveryActiveSet, bound.Method);
            Assert.Equal(1, bound.L1 / (0.5 * EqualWeights(b)), 5);
        }
    }

    /// <summary>
    /// 3,000 random sites, asks and pairs of loads, half of them on the site's worst set by design: none passes the bound,
    /// and the search comes within a millionth of it.
    /// </summary>
    [Fact]
    public void No_searched_ask_moves_the_angles_further_than_the_bound()
    {
        var random = new Random(32);
        var worst = 0.0;
        for (var trial = 0; trial < 3_000; trial++)
        {
            var (problem, shape) = Draw(random);
            var load = random.NextDouble() * 60 - 20;
            var step = (random.NextDouble() - 0.5) * (trial % 2 == 0 ? 0.1 : 20);
            var from = problem.Solve(load);
            var to = problem.Solve(load + step);
            var moved = from.Zip(to, (x, y) => Math.Abs(x - y)).Sum();
            var ratio = moved / AngleSensitivity.For(shape, Math.Abs(step)).L1;
            Assert.True(ratio <= 1 + 1e-7, $"Trial {trial} moved the answer {ratio:R} times the bound.");
            worst = Math.Max(worst, ratio);
        }

        Assert.True(worst > 1 - 1e-4, "The search should touch the bound.");
    }

    private static (OneBusAngleProblem, AngleSiteShape) Draw(Random random)
    {
        var n = random.Next(1, 5);
        var equal = random.Next(2) == 0;
        double Weight() => equal ? 1_000 : 1_000 * Math.Pow(10, random.NextDouble() * 2 - 1);
        var own = Weight();
        var parallel = Enumerable.Range(0, n).Select(_ => Enumerable.Range(0, random.Next(1, 3)).Select(_ =>
        {
            var negative = random.Next(8) == 0;
            var b = (20 + 100 * random.NextDouble()) * (negative ? -1 : 1);
            return (B: b, Limit: random.Next(4) == 0 ? double.PositiveInfinity : Math.Abs(b) * 0.3 * random.NextDouble());
        }).ToArray()).ToArray();
        var neighbours = parallel.Select(lines => (
            Weight: Weight(),
            Target: random.NextDouble() * 2 - 1,
            B: lines.Sum(line => line.B),
            Reach: lines.Min(line => line.Limit / Math.Abs(line.B)))).ToArray();
        var problem = new OneBusAngleProblem
        {
            OwnWeight = own,
            OwnTarget = random.NextDouble() * 2 - 1,
            Neighbours = neighbours,
            Plants = random.Next(3) > 0
                ? []
                : [(0, 20 * random.NextDouble(), random.Next(2) * random.NextDouble(), random.NextDouble() * 50)],
            Unserved = 1e4,
        };
        var shaped = parallel.SelectMany((lines, c) => lines.Select(
            line => new AngleSiteLine(c % 2 == 0 ? 0 : c + 1, c % 2 == 0 ? c + 1 : 0, line.B, double.IsFinite(line.Limit)))).ToArray();
        return (problem, new AngleSiteShape(1, [own, .. neighbours.Select(x => x.Weight)], shaped, NoPriceBound));
    }

    [Fact]
    public void Lines_without_a_limit_leave_fewer_sets_and_a_smaller_bound()
    {
        double[] b = [10, 40, 70];
        var limited = AngleSensitivity.For(Star(b), 1).L1;
        var free = AngleSensitivity.For(Star(b, limited: false), 1).L1;
        Assert.True(free < limited);
        Assert.Equal(1, free / (2 * 120 / (120 * 120 + 100 + 1600 + 4900.0)), 5);
    }

    [Fact]
    public void Parallel_lines_act_as_one_that_any_limit_holds()
    {
        var twice = new AngleSiteShape(
            1, [1, 1, 1], [new(0, 1, 10, false), new(1, 0, 30, true), new(0, 2, 25, true)], NoPriceBound);
        Assert.Equal(AngleSensitivity.For(Star([40, 25]), 1).L1, AngleSensitivity.For(twice, 1).L1, 12);
    }

    [Fact]
    public void Parallel_lines_that_cancel_exactly_carry_nothing()
    {
        var cancelled = new AngleSiteShape(
            1, [1, 1, 1], [new(0, 1, 10, true), new(0, 1, -10, true), new(0, 2, 25, true)], NoPriceBound);

        // Free: one copy idle. Held: the first neighbour moves along with the bus.
        Assert.Equal(1, AngleSensitivity.For(cancelled, 1).L1 / (2 * 25 / (625 / 2.0 + 625)), 5);
        var dead = new AngleSiteShape(1, [1, 1], [new(0, 1, 10, true), new(0, 1, -10, true)], NoPriceBound);
        Assert.Equal(0, AngleSensitivity.For(dead, 1).L1);
    }

    [Fact]
    public void Parallel_lines_that_almost_cancel_fall_back_to_the_price_bound()
    {
        var shape = new AngleSiteShape(1, [1, 1], [new(0, 1, 10, true), new(0, 1, -10.0000001, true)], 100);
        Assert.Equal(SensitivityMethod.UnservedPrice, AngleSensitivity.For(shape, 1).Method);
    }

    [Fact]
    public void The_price_bound_takes_over_where_it_is_smaller()
    {
        var bound = AngleSensitivity.For(Star([0.001], price: 50), 2);
        Assert.Equal(SensitivityMethod.UnservedPrice, bound.Method);
        Assert.Equal(1, bound.L1 / Math.Sqrt(2 * 2 * 50 * 2.0), 5);
    }

    [Fact]
    public void The_relaxation_is_exact_for_alike_neighbours_and_never_below_the_maximum()
    {
        var random = new Random(33);
        var loosest = 1.0;
        for (var trial = 0; trial < 400; trial++)
        {
            var n = random.Next(1, 11);
            var alike = trial % 4 == 0;
            double Susceptance() => (1 + 9 * random.NextDouble()) * (random.Next(10) == 0 ? -1 : 1);
            var b = Enumerable.Range(0, n).Select(_ => alike ? 10 : Susceptance()).ToArray();
            double[] weights = alike || trial % 4 == 1
                ? [.. Enumerable.Repeat(7.0, n + 1)]
                : [.. Enumerable.Range(0, n + 1).Select(_ => 1 + 9 * random.NextDouble())];
            var lines = b.Select((x, c) => new AngleSiteLine(0, c + 1, x, alike || random.Next(4) > 0)).ToList();
            if (trial % 7 == 0)
                lines.Add(new AngleSiteLine(0, 1, -b[0], true));
            var shape = new AngleSiteShape(1, weights, lines, NoPriceBound);
            var exact = AngleSensitivity.For(shape, 1).L1;
            var relaxed = AngleSensitivity.For(shape, 1, enumerateUpTo: 0).L1;
            Assert.True(relaxed >= exact * (1 - 1e-12), $"Trial {trial}: relaxed {relaxed}, exact {exact}.");
            if (alike && trial % 7 != 0)
                Assert.Equal(1, relaxed / exact, 9);
            var ratio = exact > 0 ? relaxed / exact : 1;
            loosest = Math.Max(loosest, ratio);
        }

        Assert.True(loosest < 5, $"The relaxation is {loosest} times the maximum somewhere.");
    }

    [Fact]
    public void Sites_with_very_many_lines_get_the_relaxation()
    {
        var bound = AngleSensitivity.For(Star([.. Enumerable.Repeat(50.0, 60)]), 1);
        Assert.Equal(SensitivityMethod.RelaxedActiveSets, bound.Method);
        Assert.Equal(1, bound.L1 / (2 * 60 / (50.0 * 61)), 5);
        Assert.Equal("proven relaxation over active sets", bound.Words);
    }

    [Fact]
    public void A_site_without_neighbours_answers_nothing_that_could_move()
    {
        var alone = new AngleSiteShape(1, [0], [], 100);
        Assert.Equal(0, AngleSensitivity.For(alone, 1).L1);
        Assert.Equal(0, alone.Copies);
    }

    [Fact]
    public void Shapes_that_make_no_sense_are_refused()
    {
        Assert.Throws<ArgumentException>(() => new AngleSiteShape(1, [1, 0], [], 1));
        Assert.Throws<ArgumentException>(() => new AngleSiteShape(1, [1, double.NaN], [], 1));
        Assert.Throws<ArgumentException>(() => new AngleSiteShape(1, [1, 1e7], [], 1));
        Assert.Throws<ArgumentException>(() => new AngleSiteShape(1, [1, 1], [new(0, 2, 1, true)], 1));
        Assert.Throws<ArgumentException>(() => new AngleSiteShape(1, [1, 1], [new(0, 0, 1, true)], 1));
        Assert.Throws<ArgumentException>(() => new AngleSiteShape(1, [1, 1], [new(0, 1, 0, true)], 1));
        Assert.Throws<ArgumentException>(() => new AngleSiteShape(1, [1, 1, 1], [new(1, 2, 1, true)], 1));
        Assert.Throws<ArgumentException>(() => new AngleSiteShape(1, [1, 1], [new(0, 1, 1, true), new(0, 1, 1e7, true)], 1));
        Assert.Throws<ArgumentOutOfRangeException>(() => new AngleSiteShape(1, [1, 1], [], 0));
        Assert.Throws<ArgumentOutOfRangeException>(() => new AngleSiteShape(0, [1], [], 1));
        Assert.Throws<ArgumentOutOfRangeException>(() => new AngleSiteShape(2, [1], [], 1));
    }
}
