using Halfvoice.Plans;
using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

public class ScopeAllowanceTests
{
    private static readonly TimeSpan FiveMinutes = TimeSpan.FromMinutes(5);

    private static ScopeAllowance Of(PrivacyScope scope, double epsilon, int rounds, int cycles = 3, bool once = false) =>
        ScopeAllowance.For(new PrivacySettings { Scope = scope, Epsilon = epsilon }, rounds, FiveMinutes, cycles, once);

    /// <summary>Basic composition of 100 answers of ε 0.1 is 10 exactly (Dwork and Roth 2014, theorem 3.16, from memory).</summary>
    [Fact]
    public void A_hundred_answers_of_a_tenth_add_up_to_ten()
    {
        Assert.Equal(10m, Of(PrivacyScope.Round, 0.1, 100).EpsilonPerCycle);
        Assert.Equal(0.1m, Of(PrivacyScope.Cycle, 10, 100).EpsilonPerAnswer);
        Assert.Equal(10m, Of(PrivacyScope.Cycle, 10, 100).EpsilonPerCycle);
    }

    [Theory]
    [InlineData(PrivacyScope.Round, "4", "160", "46080", "480")]
    [InlineData(PrivacyScope.Cycle, "0.1", "4", "1152", "12")]
    [InlineData(PrivacyScope.Day, "0.000347222222", "0.01388888888", "3.99999999744", "0.04166666664")]
    [InlineData(PrivacyScope.Campaign, "0.033333333333", "1.33333333332", "383.99999999616", "3.99999999996")]
    public void Each_scope_shares_four_among_its_answers_and_rounds_down(
        PrivacyScope scope, string answer, string cycle, string day, string campaign)
    {
        var allowance = Of(scope, 4, 40);
        var culture = System.Globalization.CultureInfo.InvariantCulture;
        Assert.Equal(decimal.Parse(answer, culture), allowance.EpsilonPerAnswer);
        Assert.Equal(decimal.Parse(cycle, culture), allowance.EpsilonPerCycle);
        Assert.Equal(decimal.Parse(day, culture), allowance.EpsilonPerDay);
        Assert.Equal(decimal.Parse(campaign, culture), allowance.EpsilonPerCampaign);
    }

    [Fact]
    public void A_site_without_adjustable_plant_spends_the_cycle_on_its_one_answer()
    {
        var allowance = Of(PrivacyScope.Cycle, 4, 40, once: true);
        Assert.Equal(1, allowance.AnswersPerCycle);
        Assert.Equal(4m, allowance.EpsilonPerAnswer);
    }

    [Fact]
    public void A_day_that_is_no_whole_number_of_cycles_is_rounded_up()
    {
        var privacy = new PrivacySettings { Scope = PrivacyScope.Day, Epsilon = 1 };
        Assert.Equal(124, ScopeAllowance.For(privacy, 1, TimeSpan.FromMinutes(11.7), 1, false).CyclesPerDay);
        Assert.Equal(1, ScopeAllowance.For(privacy, 1, TimeSpan.FromDays(1), 1, false).CyclesPerDay);
    }

    [Fact]
    public void Periods_follow_the_scope()
    {
        Assert.Equal(289, Of(PrivacyScope.Cycle, 1, 1).PeriodOf(289).Index);
        Assert.Equal(1, Of(PrivacyScope.Day, 1, 1).PeriodOf(288).Index);
        Assert.Equal(2, Of(PrivacyScope.Day, 1, 1).PeriodOf(289).Index);
        Assert.Equal(1, Of(PrivacyScope.Campaign, 1, 1).PeriodOf(100_000).Index);
        Assert.Equal("day 2", Of(PrivacyScope.Day, 1, 1).PeriodOf(289).ToString());
        Assert.Throws<ArgumentOutOfRangeException>(() => Of(PrivacyScope.Day, 1, 1).PeriodOf(0));
    }

    [Theory]
    [InlineData(0)]
    [InlineData(-1)]
    [InlineData(1000.0000001)]
    [InlineData(double.NaN)]
    [InlineData(double.PositiveInfinity)]
    public void An_epsilon_out_of_range_is_refused(double epsilon) =>
        Assert.Throws<ArgumentOutOfRangeException>(() => Of(PrivacyScope.Cycle, epsilon, 1));

    [Fact]
    public void Too_many_answers_for_the_epsilon_are_refused() =>
        Assert.Throws<ArgumentException>(() => Of(PrivacyScope.Campaign, 1e-9, 100_000, 100_000));

    [Theory]
    [InlineData(0)]
    [InlineData(1441)]
    public void An_interval_out_of_range_is_refused(int minutes) =>
        Assert.Throws<ArgumentOutOfRangeException>(
            () => ScopeAllowance.For(new PrivacySettings(), 1, TimeSpan.FromMinutes(minutes), 1, false));

    [Fact]
    public void Units_keep_the_decimal_that_the_plan_states()
    {
        Assert.Equal(100_000_000_000, EpsilonUnits.Allowance(0.1));
        Assert.Equal(1_000_000_000_000_000, EpsilonUnits.Allowance(1000));
        Assert.Equal(333_333_333_334, (long)EpsilonUnits.Charge(new ExactFraction(1, 3)));
    }
}
