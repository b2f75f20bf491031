using System.Numerics;
using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

public class AnswerLatticeTests
{
    private static readonly AnswerLattice Unit = new(0);

    [Theory]
    [InlineData(0.5, 1)]
    [InlineData(1.5, 2)]
    [InlineData(2.5, 3)]
    [InlineData(-0.5, 0)]
    [InlineData(-1.5, -1)]
    [InlineData(-2.5, -2)]
    [InlineData(0.49999999999999994, 0)]
    [InlineData(-0.49999999999999994, 0)]
    [InlineData(-0.5000000000000001, -1)]
    [InlineData(0, 0)]
    [InlineData(7, 7)]
    [InlineData(-7, -7)]
    [InlineData(2251799813685247.5, 2251799813685248)]
    [InlineData(-2251799813685247.5, -2251799813685247)]
    [InlineData(double.Epsilon, 0)]
    [InlineData(-double.Epsilon, 0)]
    public void Rounding_is_half_up_and_exact(double value, long steps) =>
        Assert.Equal(steps, Unit.Quantize(value, -1e15 * 4, 1e15 * 4));

    /// <summary>Against ⌊v/g + ½⌋ in exact fractions.</summary>
    [Fact]
    public void Rounding_agrees_with_exact_arithmetic()
    {
        var random = new Random(3);
        for (var i = 0; i < 20_000; i++)
        {
            var exponent = random.Next(-60, 5);
            var value = Math.ScaleB(random.NextDouble() - 0.5, random.Next(-60, exponent + 50));
            if (i % 3 == 0)
                value = Math.ScaleB(Math.Round(Math.ScaleB(value, -exponent + 1)), exponent - 1);
            var exact = (ExactFraction.FromDouble(value) / ExactFraction.PowerOfTwo(exponent) + new ExactFraction(1, 2)).Floor();
            var lattice = new AnswerLattice(exponent);
            var bound = lattice.ToValue(AnswerLattice.MaxSteps);
            Assert.Equal(exact, lattice.Quantize(value, -bound, bound));
        }
    }

    [Fact]
    public void Values_beyond_public_bounds_are_clamped_before_rounding()
    {
        var lattice = new AnswerLattice(-4);
        Assert.Equal(32, lattice.Quantize(1e300, -1, 2));
        Assert.Equal(-16, lattice.Quantize(-1e300, -1, 2));
        Assert.Equal(16, lattice.Quantize(1, -1, 2));
    }

    [Theory]
    [InlineData(double.NaN)]
    [InlineData(double.PositiveInfinity)]
    [InlineData(double.NegativeInfinity)]
    public void What_is_no_number_is_refused_without_quoting_it(double value)
    {
        var error = Assert.Throws<ArgumentException>(() => Unit.Quantize(value, -1, 1));
        Assert.DoesNotContain(value.ToString(System.Globalization.CultureInfo.InvariantCulture), error.Message);
    }

    [Theory]
    [InlineData(1, -1)]
    [InlineData(double.NaN, 1)]
    [InlineData(0, 1e16)]
    [InlineData(double.NegativeInfinity, 1)]
    public void Bounds_that_do_not_fit_are_refused(double low, double high) =>
        Assert.Throws<ArgumentOutOfRangeException>(() => Unit.Quantize(0, low, high));

    [Fact]
    public void Steps_go_to_values_and_back_unchanged()
    {
        var random = new Random(4);
        for (var i = 0; i < 2_000; i++)
        {
            var lattice = new AnswerLattice(random.Next(-60, 20));
            var steps = random.NextInt64(-AnswerLattice.MaxSteps, AnswerLattice.MaxSteps + 1);
            var bound = lattice.ToValue(AnswerLattice.MaxSteps);
            Assert.Equal(steps, lattice.Quantize(lattice.ToValue(steps), -bound, bound));
        }
    }

    [Fact]
    public void Saturation_cuts_at_the_public_range()
    {
        Assert.Equal(AnswerLattice.MaxSteps, AnswerLattice.Saturate(long.MaxValue));
        Assert.Equal(-AnswerLattice.MaxSteps, AnswerLattice.Saturate(long.MinValue));
        Assert.Equal(-5, AnswerLattice.Saturate(-5));
        Assert.True(AnswerLattice.IsWithinRange(AnswerLattice.MaxSteps));
        Assert.False(AnswerLattice.IsWithinRange(AnswerLattice.MaxSteps + 1));
    }

    [Theory]
    [InlineData(1, 100, -40)]
    [InlineData(1.99, 100, -40)]
    [InlineData(2, 100, -39)]
    [InlineData(1, 4096, -39)]
    [InlineData(1, 1e6, -32)]
    [InlineData(1e-3, 0.5, -50)]
    public void The_exponent_follows_the_scale_until_the_bound_needs_room(double scale, double bound, int exponent)
    {
        var lattice = AnswerLattice.For(scale, bound);
        Assert.Equal(exponent, lattice.Exponent);
        Assert.True((bound + 64 * scale) / lattice.Step < AnswerLattice.MaxSteps);
    }

    [Theory]
    [InlineData(0, 1)]
    [InlineData(double.NaN, 1)]
    [InlineData(1, -1)]
    [InlineData(1, double.PositiveInfinity)]
    public void A_scale_or_bound_out_of_range_is_refused(double scale, double bound) =>
        Assert.Throws<ArgumentOutOfRangeException>(() => AnswerLattice.For(scale, bound));

    [Fact]
    public void Noiseless_lattices_are_finer_than_any_limit_of_a_plan()
    {
        Assert.True(AnswerLattice.NoiselessMw.Step < 1e-8);
        Assert.True(AnswerLattice.NoiselessRad.Step < 1e-13);
        Assert.True(AnswerLattice.NoiselessMw.ToValue(AnswerLattice.MaxSteps) > 1e6);
        Assert.True(AnswerLattice.NoiselessRad.ToValue(AnswerLattice.MaxSteps) > 60);
    }

    [Theory]
    [InlineData(1.0, 0, 1, 1)]
    [InlineData(1.0, -2, 1, 4)]
    [InlineData(0.1, -2, 1, 1)]
    [InlineData(0.3, -2, 1, 2)]
    [InlineData(0, -2, 1, 0)]
    [InlineData(0.3, -2, 5, 6)]
    public void Integer_sensitivity_is_the_ceiling_and_one_less_than_the_dimension(double delta, int exponent, int dimension, int steps) =>
        Assert.Equal(steps, new AnswerLattice(exponent).IntegerSensitivity(ExactFraction.FromDouble(delta), dimension));

    [Fact]
    public void Integer_sensitivity_sees_the_last_bit_of_a_double()
    {
        // 0.1 as a double is a little above 1/10: one step more than the decimal would give at g = 0.1's own last place.
        var lattice = new AnswerLattice(-52);
        var delta = ExactFraction.FromDouble(1 + Math.ScaleB(1, -52));
        Assert.Equal((BigInteger.One << 52) + 1, lattice.IntegerSensitivity(delta, 1));
        Assert.Equal((BigInteger.One << 52) + 2, lattice.IntegerSensitivity(delta + ExactFraction.PowerOfTwo(-200), 1));
    }

    /// <summary>On a grid four times finer than the lattice no pair of vectors moves further than claimed, and some move as far.</summary>
    [Fact]
    public void No_pair_of_vectors_moves_further_than_the_integer_sensitivity()
    {
        for (var quarters = 0; quarters <= 8; quarters++)
        {
            var claimed = Unit.IntegerSensitivity(new ExactFraction(quarters, 4), 2);
            var worst = 0L;
            for (var x = 0; x < 4; x++)
            {
                for (var y = 0; y < 4; y++)
                {
                    for (var first = -quarters; first <= quarters; first++)
                    {
                        var rest = quarters - Math.Abs(first);
                        worst = Math.Max(worst, Moved(x, first) + Math.Max(Moved(y, rest), Moved(y, -rest)));
                    }
                }
            }

            // Touching it needs both coordinates to pass an integer by a fraction, which this grid cannot for a remainder of ¼.
            Assert.True(worst <= claimed);
            if (quarters >= 2 && quarters % 4 != 1)
                Assert.Equal((long)claimed, worst);
        }
    }

    private static long Moved(int quarters, int by) =>
        Math.Abs(Unit.Quantize((quarters + by) / 4.0, -100, 100) - Unit.Quantize(quarters / 4.0, -100, 100));

    [Fact]
    public void Fractions_round_towards_the_named_side_for_either_sign()
    {
        Assert.Equal(-2, new ExactFraction(3, -2).Floor());
        Assert.Equal(-1, new ExactFraction(-3, 2).Ceiling());
        Assert.Equal(1, new ExactFraction(3, 2).Floor());
        Assert.Equal(2, new ExactFraction(3, 2).Ceiling());
        Assert.Equal(-3, new ExactFraction(-3, 1).Floor());
        Assert.Equal(new ExactFraction(1, 3), new ExactFraction(2, 3) / 2);
        Assert.Equal(new ExactFraction(1, 2), default(ExactFraction) + new ExactFraction(1, 2));
        Assert.True(ExactFraction.FromDouble(0.1) > new ExactFraction(1, 10));
        Assert.Equal(-double.Epsilon, -Math.Pow(2, -1074));
        Assert.Equal(-1 * ExactFraction.PowerOfTwo(-1074), ExactFraction.FromDouble(-double.Epsilon));
        Assert.Throws<ArgumentException>(() => ExactFraction.FromDouble(double.NaN));
        Assert.Throws<ArgumentException>(() => new ExactFraction(1, 0));
    }
}
