using System.Text.Json;
using Halfvoice.Plans;
using Halfvoice.Rehearsal;
using Halfvoice.Tests.Coordination;

namespace Halfvoice.Tests.Rehearsal;

/// <summary>Each acceptance limit passes and fails, and says what was measured.</summary>
public class AcceptanceJudgeTests
{
    private static readonly CycleResult Good = new()
    {
        Cycle = 1,
        Settled = true,
        End = "settled",
        Rounds = 12,
        Seconds = 30,
        OptimumPerHour = 1000,
        CostPerHour = 1005,
        CostGap = 0.005,
        ReserveMw = 12,
        WorstLoading = 0.97,
        WorstLine = "l1",
        Bytes = 4000,
        EpsilonBySite = new Dictionary<string, double> { ["s0"] = 0.5, ["s1"] = 0.25 },
    };

    public static TheoryData<string, string, double> Limits => new()
    {
        { "settle_within", "s", 120 },
        { "cost_gap", "fraction", 0.02 },
        { "line_loading", "fraction", 0.98 },
        { "reserve_mw", "MW", 15 },
        { "epsilon_per_day", "epsilon", 200 },
    };

    [Theory]
    [MemberData(nameof(Limits))]
    public void Every_limit_passes_when_the_worst_cycle_keeps_it(string name, string unit, double limit)
    {
        var result = Judge(Good, Good with { Cycle = 2, Seconds = 20, CostGap = 0.001, ReserveMw = 3, WorstLoading = 0.5 })[name];
        Assert.True(result.Passed);
        Assert.Equal((unit, limit), (result.Unit, result.Limit));
        Assert.Equal(name switch { "settle_within" => 30, "cost_gap" => 0.005, "line_loading" => 0.97, "reserve_mw" => 12, _ => 0.5 * 288 }, result.Measured);
    }

    [Fact]
    public void Every_limit_fails_when_one_cycle_breaks_it_and_the_others_still_pass()
    {
        var broken = new Dictionary<string, CycleResult>
        {
            ["settle_within"] = Good with { Seconds = 120.001 },
            ["cost_gap"] = Good with { CostGap = 0.0201 },
            ["line_loading"] = Good with { WorstLoading = 0.981 },
            ["reserve_mw"] = Good with { ReserveMw = 15.01 },
            ["epsilon_per_day"] = Good with { EpsilonBySite = new Dictionary<string, double> { ["s7"] = 0.7 } },
        };
        foreach (var (name, cycle) in broken)
        {
            foreach (var result in Judge(Good, cycle, Good).Values)
                Assert.Equal(result.Name != name, result.Passed);
        }
    }

    [Fact]
    public void A_limit_that_is_just_met_passes()
    {
        var edge = Good with { Seconds = 120, CostGap = 0.02, WorstLoading = 0.98, ReserveMw = 15 };
        Assert.All(Judge(edge).Values, result => Assert.True(result.Passed));
    }

    [Fact]
    public void A_cycle_that_did_not_settle_fails_the_time_whatever_it_took()
    {
        var result = Judge(Good, Good with { Settled = false, Seconds = 1 })["settle_within"];
        Assert.False(result.Passed);
        Assert.Null(result.Measured);
    }

    [Fact]
    public void What_could_not_be_measured_fails()
    {
        var results = Judge(Good, Good with { CostGap = null, ReserveMw = null, WorstLoading = null });
        foreach (var name in new[] { "cost_gap", "reserve_mw", "line_loading" })
            Assert.Equal((false, null), (results[name].Passed, results[name].Measured));
        Assert.True(results["settle_within"].Passed);
        Assert.All(Judge().Values, result => Assert.Equal((false, null), (result.Passed, result.Measured)));
    }

    [Fact]
    public void Without_a_privacy_mechanism_a_limit_on_epsilon_is_not_reached()
    {
        var plan = Plan() with { Privacy = new PrivacySettings { Mechanism = MechanismKind.None, Stated = true } };
        var result = AcceptanceJudge.Judge(plan, [Good with { EpsilonBySite = new Dictionary<string, double>() }]).Single(r => r.Name == "epsilon_per_day");
        Assert.Equal((false, null), (result.Passed, result.Measured));
        Assert.Null(AcceptanceJudge.EpsilonPerDay(plan, [Good]));
    }

    [Fact]
    public void Without_an_accept_section_the_documented_defaults_are_judged()
    {
        var results = AcceptanceJudge.Judge(Plan() with { Accept = new AcceptSettings() }, [Good]);
        Assert.Equal([("settle_within", 240.0), ("cost_gap", 0.01), ("line_loading", 1.0)], results.Select(r => (r.Name, r.Limit)));
        Assert.All(results, result => Assert.True(result.Passed));
    }

    [Theory]
    [InlineData(300, 240)]
    [InlineData(120, 60)]
    [InlineData(90, 45)]
    [InlineData(4, 2)]
    public void The_default_settle_time_is_the_interval_less_a_minute_and_at_least_half_of_it(double interval, double expected) =>
        Assert.Equal(expected, AcceptanceJudge.SettleWithinSeconds(Plan() with { Interval = TimeSpan.FromSeconds(interval), Accept = new AcceptSettings() }));

    [Fact]
    public void A_day_has_as_many_cycles_as_intervals_fit_rounded_up()
    {
        Assert.Equal(0.5 * 288, AcceptanceJudge.EpsilonPerDay(Plan(), [Good]));
        Assert.Equal(0.5 * 4, AcceptanceJudge.EpsilonPerDay(Plan() with { Interval = TimeSpan.FromHours(7) }, [Good]));
    }

    [Fact]
    public void The_verdict_is_snake_case_json_with_the_promised_keys()
    {
        var verdict = new Verdict
        {
            Passed = false,
            Plan = "Small",
            Limits = AcceptanceJudge.Judge(Plan(), [Good with { Settled = false }]),
            Cycles = [Good],
            Seed = 7,
            Commit = "unknown",
            Options = new Dictionary<string, string> { ["Some-Option"] = "on" },
            Notes = ["A note."],
        };
        using var json = JsonDocument.Parse(verdict.ToJson());
        var root = json.RootElement;
        Assert.False(root.GetProperty("passed").GetBoolean());
        Assert.Equal(7, root.GetProperty("seed").GetInt64());
        Assert.Equal("unknown", root.GetProperty("commit").GetString());
        Assert.Equal("on", root.GetProperty("options").GetProperty("Some-Option").GetString());
        var limit = root.GetProperty("limits")[0];
        Assert.Equal(["name", "limit", "measured", "unit", "passed"], limit.EnumerateObject().Select(p => p.Name));
        Assert.Equal(JsonValueKind.Null, limit.GetProperty("measured").ValueKind);
        var cycle = root.GetProperty("cycles")[0];
        foreach (var key in new[] { "settled", "rounds", "seconds", "cost_gap", "reserve_mw", "worst_loading", "bytes" })
            Assert.True(cycle.TryGetProperty(key, out _), key);
        Assert.Equal(0.25, cycle.GetProperty("epsilon_by_site").GetProperty("s1").GetDouble());
    }

    private static Dictionary<string, LimitResult> Judge(params CycleResult[] cycles) =>
        AcceptanceJudge.Judge(Plan(), cycles).ToDictionary(result => result.Name);

    private static Plan Plan() => SmallPlan.Of(2, 1) with
    {
        Privacy = new PrivacySettings { Stated = true },
        Accept = new AcceptSettings
        {
            SettleWithin = TimeSpan.FromSeconds(120),
            CostGapFraction = 0.02,
            LineLoadingFraction = 0.98,
            ReserveMw = 15,
            EpsilonPerDay = 200,
        },
    };
}
