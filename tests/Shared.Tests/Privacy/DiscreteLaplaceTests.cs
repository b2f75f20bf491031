using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

/// <summary>
/// Statistical tests here have a false-alarm rate of 1e-4 each over the choice of the seed; the seeds are fixed, so a
/// sound build never fails by chance.
/// </summary>
public class DiscreteLaplaceTests
{
    private const double FalseAlarm = 1e-4;
    private const int Sample = 100_000;

    [Theory]
    [InlineData(1)]
    [InlineData(2)]
    [InlineData(3)]
    [InlineData(7)]
    [InlineData(10)]
    [InlineData(1_000)]
    [InlineData(1_099_511_627_776)]
    [InlineData(DiscreteLaplace.MaxScale)]
    public void Draws_follow_the_exact_probabilities(long scale)
    {
        var draws = NoiseStatistics.Draw(Sample, scale, 20_260_101);
        Assert.True(NoiseStatistics.PValue(draws, NoiseStatistics.Edges(scale), scale) > FalseAlarm);
    }

    [Theory]
    [InlineData(10)]
    [InlineData(1_099_511_627_776)]
    public void Half_the_scale_is_caught_by_the_same_test(long scale)
    {
        var draws = NoiseStatistics.Draw(Sample, scale / 2, 5);
        Assert.True(NoiseStatistics.PValue(draws, NoiseStatistics.Edges(scale), scale) < 1e-12);
    }

    [Fact]
    public void A_reused_draw_is_caught_by_the_same_test()
    {
        // One draw served to eight answers in a row: each value is right by itself, the sample is not.
        var draws = NoiseStatistics.Draw(Sample / 8, 10, 6).SelectMany(z => Enumerable.Repeat(z, 8)).ToArray();
        Assert.True(NoiseStatistics.PValue(draws, NoiseStatistics.Edges(10), 10) < 1e-9);
    }

    [Fact]
    public void Zero_counted_from_both_sides_would_be_caught()
    {
        var draws = NoiseStatistics.Draw(Sample, 3, 7);
        var twice = draws.Concat(draws.Where(z => z == 0)).ToArray();
        Assert.True(NoiseStatistics.PValue(twice, NoiseStatistics.Edges(3), 3) < 1e-12);
    }

    [Fact]
    public void Neighbouring_draws_are_unrelated()
    {
        // The lag-one correlation of n independent draws is within ±4.9/√n but for one seed in a million.
        var draws = NoiseStatistics.Draw(Sample, 1L << 40, 8);
        var sum = 0.0;
        var square = 0.0;
        for (var i = 1; i < draws.Length; i++)
        {
            sum += (double)draws[i] * draws[i - 1];
            square += (double)draws[i] * draws[i];
        }

        Assert.True(Math.Abs(sum / square) < 4.9 / Math.Sqrt(Sample));
    }

    /// <summary>
    /// Check values computed independently of this code, by exact sums: pmf and variance after Ghosh, Roughgarden and
    /// Sundararajan 2009 (from memory), the tail derived from them.
    /// </summary>
    [Fact]
    public void Law_gives_the_known_values()
    {
        Assert.Equal(0.0499584, new DiscreteLaplaceLaw(10).Probability(0), 7);
        Assert.Equal(0.462117, new DiscreteLaplaceLaw(1).Probability(0), 6);
        Assert.Equal(199.833417, new DiscreteLaplaceLaw(10).Variance, 6);
        Assert.Equal(1.841347, new DiscreteLaplaceLaw(1).Variance, 6);
        Assert.Equal(6.638002e-5, new DiscreteLaplaceLaw(1).TailProbability(10), 11);
        Assert.Equal(1, new DiscreteLaplaceLaw(1).TailProbability(0));
    }

    [Theory]
    [InlineData(1)]
    [InlineData(10)]
    [InlineData(250)]
    public void Law_agrees_with_a_plain_sum(double scale)
    {
        var weights = Enumerable.Range(-20_000, 40_001).Select(z => (Z: z, W: Math.Exp(-Math.Abs(z) / scale))).ToArray();
        var total = weights.Sum(x => x.W);
        var law = new DiscreteLaplaceLaw(scale);
        Assert.Equal(Math.Exp(-3 / scale) / total, law.Probability(-3), 12);
        Assert.Equal(1, weights.Sum(x => x.W * x.Z * x.Z) / total / law.Variance, 9);
        Assert.Equal(1, law.StandardDeviation * law.StandardDeviation / law.Variance, 12);
        Assert.Equal(weights.Where(x => Math.Abs(x.Z) >= 17).Sum(x => x.W) / total, law.TailProbability(17), 12);
        Assert.Equal(weights.Where(x => x.Z >= 17).Sum(x => x.W) / total, NoiseStatistics.AtLeast(17, scale), 12);
        Assert.Equal(weights.Where(x => x.Z >= -17).Sum(x => x.W) / total, NoiseStatistics.AtLeast(-17, scale), 12);
    }

    /// <summary>At the noise's real scale a one-step move changes every probability by the factor e^(±1/scale) and no more.</summary>
    [Fact]
    public void Probabilities_of_neighbouring_answers_stay_within_the_claimed_ratio()
    {
        var law = new DiscreteLaplaceLaw(10);
        for (var z = -200; z <= 200; z++)
        {
            var ratio = Math.Log(law.Probability(z) / law.Probability(z - 7));
            Assert.InRange(ratio, -0.7 - 1e-12, 0.7 + 1e-12);
        }
    }

    [Theory]
    [InlineData(0)]
    [InlineData(-1)]
    [InlineData(DiscreteLaplace.MaxScale + 1)]
    public void A_scale_outside_its_range_is_refused(long scale)
    {
        var source = new SeededNoiseSource(1);
        Assert.Throws<ArgumentOutOfRangeException>(() => DiscreteLaplace.Draw(source, scale));
    }

    [Theory]
    [InlineData(0x00)]
    [InlineData(0xFF)]
    public void A_source_that_repeats_itself_ends_in_an_error_and_never_in_an_endless_loop(byte stuck)
    {
        // Ones are rejected for ever as too large, zeros make every coin of the geometric part succeed for ever.
        Assert.Throws<InvalidOperationException>(() => DiscreteLaplace.Draw(new StuckSource(stuck), 1_000));
    }

    private sealed class StuckSource(byte value) : INoiseSource
    {
        public bool IsPrivate => false;

        public void Fill(Span<byte> bytes) => bytes.Fill(value);
    }
}
