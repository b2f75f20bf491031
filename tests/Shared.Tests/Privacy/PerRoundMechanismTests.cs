using Halfvoice.Plans;
using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

/// <summary>Statistical tests here have a false-alarm rate of 1e-4 each over the choice of the seed; the seeds are fixed.</summary>
public class PerRoundMechanismTests
{
    private static readonly SensitivityBound OneMw = InjectionSensitivity.For(1);

    private static PerRoundMechanism Of(int dimension, ulong seed, out NoiseCalibration calibration)
    {
        var bounds = AnswerBounds.Symmetric(dimension, 200);
        calibration = NoiseCalibration.For(OneMw, bounds, EpsilonUnits.PerOne / 10);
        return new PerRoundMechanism(calibration, bounds, new SeededNoiseSource(seed));
    }

    [Theory]
    [InlineData(1, 100, 1_000_000_000_000)]
    [InlineData(1, 1e6, 1_000_000_000_000)]
    [InlineData(40, 100, 100_000_000_000)]
    [InlineData(3, 0, 333_333_333_333)]
    public void The_claimed_epsilon_never_passes_the_charge_and_hardly_stays_below(int dimension, double bound, long units)
    {
        var calibration = NoiseCalibration.For(OneMw, AnswerBounds.Symmetric(dimension, bound), units);
        var charged = new ExactFraction(units, EpsilonUnits.PerOne);
        Assert.True(calibration.ClaimedEpsilon <= charged);
        Assert.True(calibration.ClaimedEpsilon * new ExactFraction(1_000_001, 1_000_000) > charged);
        var needed = ExactFraction.FromDouble(1) / ExactFraction.PowerOfTwo(calibration.Lattice.Exponent);
        Assert.True(needed + (dimension - 1) <= new ExactFraction(calibration.SensitivitySteps, 1));
        Assert.Equal(1, calibration.Scale * units / EpsilonUnits.PerOne, 4);
        Assert.Equal(Math.Sqrt(2), calibration.StandardDeviation / calibration.Scale, 6);
    }

    /// <summary>At ε 7e-12 the lattice is coarse against the sensitivity: the scale grows by a quarter, the claim stays valid.</summary>
    [Fact]
    public void An_epsilon_next_to_nothing_is_rounded_against_us()
    {
        var calibration = NoiseCalibration.For(OneMw, AnswerBounds.Symmetric(2, 50), 7);
        Assert.True(calibration.ClaimedEpsilon <= new ExactFraction(7, EpsilonUnits.PerOne));
        Assert.InRange(calibration.Scale * 7 / EpsilonUnits.PerOne, 1, 1.3);
    }

    [Fact]
    public void An_answer_that_cannot_move_still_gets_noise_for_the_solver_s_error()
    {
        var none = new SensitivityBound(0, SensitivityMethod.EveryActiveSet);
        var calibration = NoiseCalibration.For(none, AnswerBounds.Symmetric(1, 3.2), EpsilonUnits.PerOne);
        Assert.True(calibration.SensitivitySteps >= 1);
        Assert.True(calibration.Scale < 1e-9);
    }

    [Fact]
    public void A_scale_that_does_not_fit_is_refused() =>
        Assert.Throws<ArgumentException>(
            () => NoiseCalibration.For(new SensitivityBound(1e-300, SensitivityMethod.LoadChange), AnswerBounds.Symmetric(1, 0), 1));

    [Fact]
    public void A_released_answer_is_the_rounded_one_and_fresh_noise_of_the_right_law()
    {
        const int Sample = 50_000;
        using var mechanism = Of(2, 11, out var calibration);
        var draws = new long[2 * Sample];
        var steps = new long[2];
        double[] values = [12.25, -7];
        var exact = values.Select(v => mechanism.Lattice.Quantize(v, -200, 200)).ToArray();
        for (var i = 0; i < Sample; i++)
        {
            mechanism.PrepareNoise(1);
            mechanism.Release(values, steps);
            draws[2 * i] = steps[0] - exact[0];
            draws[2 * i + 1] = steps[1] - exact[1];
        }

        var edges = NoiseStatistics.Edges(calibration.ScaleSteps);
        Assert.True(NoiseStatistics.PValue(draws, edges, calibration.ScaleSteps) > 1e-4);
        Assert.True(NoiseStatistics.PValue(draws, edges, calibration.ScaleSteps * 1.05) < 1e-4);
    }

    [Fact]
    public void Noise_is_drawn_ahead_and_used_once()
    {
        using var mechanism = Of(1, 12, out _);
        mechanism.PrepareNoise(3);
        mechanism.PrepareNoise(2);
        Assert.Equal(3, mechanism.Prepared);
        var steps = new long[1];
        var seen = new HashSet<long>();
        for (var i = 0; i < 3; i++)
        {
            mechanism.Release([0], steps);
            Assert.True(seen.Add(steps[0]));
        }

        Assert.Equal(0, mechanism.Prepared);
        Assert.Throws<InvalidOperationException>(() => mechanism.Release([0], steps));
    }

    [Fact]
    public void A_failed_answer_leaves_nothing_behind_and_uses_its_noise_up()
    {
        using var mechanism = Of(2, 13, out _);
        mechanism.PrepareNoise(1);
        long[] steps = [9, 9];
        Assert.Throws<ArgumentException>(() => mechanism.Release([5, double.NaN], steps));
        Assert.Equal([0, 0], steps);
        Assert.Equal(0, mechanism.Prepared);
    }

    [Fact]
    public void Answers_stay_on_the_wire_s_range_and_replay_from_a_seed()
    {
        var bounds = AnswerBounds.Symmetric(1, 1e6);
        var calibration = NoiseCalibration.For(OneMw, bounds, EpsilonUnits.PerOne);
        var runs = Enumerable.Range(0, 2).Select(_ =>
        {
            using var mechanism = new PerRoundMechanism(calibration, bounds, new SeededNoiseSource(14));
            mechanism.PrepareNoise(50);
            var steps = new long[1];
            return Enumerable.Range(0, 50).Select(_ =>
            {
                mechanism.Release([1e300], steps);
                return steps[0];
            }).ToArray();
        }).ToArray();
        Assert.All(runs[0], steps => Assert.True(AnswerLattice.IsWithinRange(steps)));
        Assert.Equal(runs[0], runs[1]);
    }

    [Fact]
    public void A_seeded_mechanism_is_never_called_private()
    {
        using var mechanism = Of(1, 15, out _);
        Assert.False(mechanism.IsPrivate);
        Assert.Equal(MechanismKind.PerRound, mechanism.Kind);
    }

    [Fact]
    public void Mechanism_none_releases_the_rounded_answer_and_says_so()
    {
        var mechanism = new NoNoiseMechanism(AnswerLattice.NoiselessMw, AnswerBounds.Symmetric(2, 500));
        var steps = new long[2];
        mechanism.PrepareNoise(1);
        mechanism.Release([12.5, -1000], steps);
        Assert.Equal([12.5, -500], steps.Select(mechanism.Lattice.ToValue));
        Assert.False(mechanism.IsPrivate);
        Assert.Equal(MechanismKind.None, mechanism.Kind);
        Assert.True(mechanism.Prepared > 0);
        Assert.Throws<ArgumentException>(() => mechanism.Release([1], steps));
    }

    [Fact]
    public void Bounds_must_be_finite_and_ordered()
    {
        Assert.Throws<ArgumentException>(() => new AnswerBounds([], []));
        Assert.Throws<ArgumentException>(() => new AnswerBounds([0], [1, 2]));
        Assert.Throws<ArgumentException>(() => new AnswerBounds([1], [0]));
        Assert.Throws<ArgumentException>(() => new AnswerBounds([double.NaN], [0]));
        Assert.Equal(7, new AnswerBounds([-7, 1], [3, 2]).Magnitude);
    }
}
