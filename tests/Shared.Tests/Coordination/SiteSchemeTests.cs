using Halfvoice.Coordination;
using Halfvoice.Grid;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>The two site halves on figures that can be checked by hand.</summary>
public class SiteSchemeTests
{
    /// <summary>min 0.05 p² + 20 p + u x + ρ/2 (x − z)², x = p − d: p = (ρ (z + d) − 20 − u) / (0.1 + ρ) within its limits.</summary>
    [Theory]
    [InlineData(4, -25)]
    [InlineData(30, -22)]
    [InlineData(900, -22)]
    [InlineData(-900, -22)]
    public void An_injection_answer_solves_its_own_equation_and_a_bus_that_cannot_move_answers_its_data(double z, double u)
    {
        var plan = TwoBusSite(SchemeKind.Injection);
        var setup = new SetupBuilder(plan).ForSite("own");
        var scheme = new InjectionSite(setup);
        Assert.Equal([0], scheme.Adjustable);
        var rho = setup.Buses[0].PenaltyPerMw2h;
        var values = new double[2];
        scheme.Solve([12, 7], new Ask(new RoundId(1, 1), true, [z], [u]), values);
        Assert.Equal(Math.Clamp(((rho * (z + 12)) - 20 - u) / (0.1 + rho), 0, 100) - 12, values[0], 1e-9);
        Assert.Equal(3 - 7, values[1], 1e-12);
    }

    [Fact]
    public void An_ask_for_everything_gets_every_bus_and_any_other_the_moving_ones()
    {
        var bench = new SiteBench(TwoBusSite(SchemeKind.Injection), "own");
        Assert.Equal(2, bench.Step(new SiteInput.Asked(new Ask(new RoundId(1, 1), true, [4], [-25]))).Answer.Steps.Length);
        Assert.Single(bench.Step(new SiteInput.Asked(new Ask(new RoundId(1, 2), false, [4], [-25]))).Answer.Steps);
    }

    [Fact]
    public void A_one_bus_site_under_scheme_angle_runs_at_what_the_angles_carry_away_and_its_load()
    {
        // Ring of four, 1000 MW/rad a line; the angles carry 1000 · (0.03 − 0.01) + 1000 · (0.03 − 0.02) = 30 MW away.
        var plan = SmallPlan.Of(2, 2) with { Scheme = new SchemeSettings { Kind = SchemeKind.Angle } };
        var setup = new SetupBuilder(plan).ForSite("s0");
        var angle = setup.Copies.Select(copy => copy.Bus switch { "b0" => 0.03, "b1" => 0.01, _ => 0.02 }).ToArray();
        var output = new double[1];
        new AngleSite(setup).Dispatch([12], new Outcome(1, CycleEnd.Settled, 1, angle, new double[3]), output);
        Assert.Equal(42, output[0], 1e-9);
    }

    /// <summary>
    /// A site that holds the angles far harder than its plant's costs answers with flows that its plants and load add up to.
    /// </summary>
    [Fact]
    public void The_copies_of_an_angle_answer_balance_the_site()
    {
        var plan = SmallPlan.Of(2, 2) with { Scheme = new SchemeSettings { Kind = SchemeKind.Angle } };
        var setup = new SetupBuilder(plan).ForSite("s3");
        var scheme = new AngleSite(setup);
        var values = new double[3];
        scheme.Solve([12], new Ask(new RoundId(1, 1), true, new double[3], new double[3]), values);
        var own = Array.FindIndex(setup.Copies.ToArray(), copy => copy.Bus == "b3");
        var away = setup.Copies.Select((copy, c) => c == own ? 0 : 1000 * (values[own] - values[c])).Sum();
        Assert.Equal(-12, away, 1e-6);
    }

    /// <summary>Site "own": a plant of 0 to 100 MW at its first bus and a fixed one of 3 MW at its second.</summary>
    private static Plan TwoBusSite(SchemeKind kind)
    {
        var small = SmallPlan.Of(2, 1);
        var buses = small.Network.Buses.Select((bus, b) => bus with { Site = b < 2 ? "own" : "rest" }).ToArray();
        Generator[] plants = [small.Network.Generators[0], new("fixed", 1, 3, 3, 0, 1)];
        return small with
        {
            Scheme = new SchemeSettings { Kind = kind },
            Network = new Network(100, buses, small.Network.Lines, plants),
            Loads = new Dictionary<string, LoadSeries> { ["own"] = new([], [[12, 7]]), ["rest"] = new([], [[9]]) },
        };
    }
}
