using System.Text.Json;
using Halfvoice.Coordination;
using Halfvoice.Grid;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>Who is given what: the coordinator public data only, a site its own corner only.</summary>
public class SetupBuilderTests
{
    [Theory]
    [InlineData(SchemeKind.Injection)]
    [InlineData(SchemeKind.Angle)]
    public void The_coordinators_setup_holds_no_cost_no_plant_and_no_load(SchemeKind kind)
    {
        var json = SetupJson.Write(new SetupBuilder(Marked(kind)).Coordinator);
        foreach (var name in PropertyNames(json))
        {
            foreach (var word in new[] { "cost", "load", "generator", "plant", "marginal", "demand", "max_mw", "min_mw" })
                Assert.DoesNotContain(word, name, StringComparison.OrdinalIgnoreCase);
        }

        // Loads end in 618033, costs in 271828.
        Assert.DoesNotContain("618033", json, StringComparison.Ordinal);
        Assert.DoesNotContain("271828", json, StringComparison.Ordinal);
        Assert.DoesNotContain("plant-", json, StringComparison.Ordinal);
    }

    [Fact]
    public void The_coordinator_of_scheme_angle_holds_no_network_and_no_inner_bus()
    {
        var plan = InventedPlans.Make(5, 3, 4, 1) with { Scheme = new SchemeSettings { Kind = SchemeKind.Angle } };
        var network = plan.Network;
        var setup = new SetupBuilder(plan).Coordinator;
        Assert.Empty(setup.Buses);
        Assert.Empty(setup.Lines);
        var json = SetupJson.Write(setup);
        Assert.DoesNotContain(PropertyNames(json), name => name.Contains("reactance", StringComparison.Ordinal)
            || (name.Contains("limit_mw", StringComparison.Ordinal) && name != "mismatch_limit_mw"));
        var border = network.Lines.Where(l => network.Buses[l.FromBus].Site != network.Buses[l.ToBus].Site)
            .SelectMany(l => new[] { l.FromBus, l.ToBus }).Select(b => network.Buses[b].Name).ToHashSet();
        Assert.Equal(border, setup.Sites.SelectMany(site => site.Components).Select(part => part.Bus).ToHashSet());
        Assert.Contains(network.Buses, bus => !border.Contains(bus.Name));
        foreach (var inner in network.Buses.Where(bus => !border.Contains(bus.Name)))
            Assert.DoesNotContain($"\"{inner.Name}\"", json, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData(SchemeKind.Injection)]
    [InlineData(SchemeKind.Angle)]
    public void A_sites_setup_holds_its_own_plants_and_corner_and_no_load(SchemeKind kind)
    {
        var plan = Marked(kind);
        var network = plan.Network;
        var setups = new SetupBuilder(plan);
        foreach (var site in network.Sites)
        {
            var setup = setups.ForSite(site);
            var json = SetupJson.Write(setup);
            var own = network.BusesOf(site).ToHashSet();
            Assert.Equal(
                network.Generators.Where(g => own.Contains(g.Bus)).Select(g => g.Name).Order(), setup.Generators.Select(g => g.Name).Order());
            foreach (var foreign in network.Generators.Where(g => !own.Contains(g.Bus)))
                Assert.DoesNotContain(foreign.Name, json, StringComparison.Ordinal);
            Assert.DoesNotContain("618033", json, StringComparison.Ordinal);
            var touching = network.Lines.Where(l => own.Contains(l.FromBus) || own.Contains(l.ToBus)).Select(l => l.Name).Order();
            Assert.Equal(kind == SchemeKind.Angle ? touching : [], setup.Lines.Select(l => l.Name).Order());
            foreach (var plant in setup.Generators)
                Assert.Equal(network.Buses[network.Generators.Single(g => g.Name == plant.Name).Bus].Name, setup.Buses[plant.Bus].Name);
        }
    }

    [Theory]
    [InlineData(SchemeKind.Injection)]
    [InlineData(SchemeKind.Angle)]
    public void Both_ends_agree_on_the_digest_the_components_and_their_penalties(SchemeKind kind)
    {
        var plan = InventedPlans.Make(6, 8, 3, 1) with { Scheme = new SchemeSettings { Kind = kind } };
        var setups = new SetupBuilder(plan);
        foreach (var site in setups.Coordinator.Sites)
        {
            var setup = setups.ForSite(site.Name);
            Assert.Equal(setups.Coordinator.SetupDigest, setup.SetupDigest);
            var parts = kind == SchemeKind.Injection
                ? setup.Buses.Select(bus => (bus.Name, bus.PenaltyPerMw2h, 1.0))
                : setup.Copies.Select(copy => (copy.Bus, copy.WeightPerRad2h, copy.MwPerRad));
            Assert.Equal(parts, site.Components.Select(part => (part.Bus, part.Penalty, part.MwPerUnit)));
        }
    }

    [Fact]
    public void The_digest_changes_with_what_both_ends_must_agree_on()
    {
        foreach (var kind in new[] { SchemeKind.Injection, SchemeKind.Angle })
        {
            var plan = Marked(kind);
            var digest = new SetupBuilder(plan).Coordinator.SetupDigest;
            Assert.Matches("^[0-9a-f]{64}$", digest);
            Assert.Equal(digest, new SetupBuilder(plan).Coordinator.SetupDigest);
            Plan[] others =
            [
                plan with { Name = "Other" },
                plan with { Cycles = plan.Cycles + 1 },
                plan with { Stop = plan.Stop with { RoundCap = plan.Stop.RoundCap + 1 } },
                plan with { Scheme = plan.Scheme with { PenaltyFactor = 2 } },
                plan with { Scheme = plan.Scheme with { PriceScalePerMwh = 77 } },
            ];
            Assert.All(others, other => Assert.NotEqual(digest, new SetupBuilder(other).Coordinator.SetupDigest));
        }
    }

    [Fact]
    public void Under_scheme_angle_the_digest_changes_with_a_tie_line_that_two_sites_share()
    {
        var plan = Marked(SchemeKind.Angle);
        var digest = new SetupBuilder(plan).Coordinator.SetupDigest;
        var network = plan.Network;
        var tie = Enumerable.Range(0, network.Lines.Count)
            .First(l => network.Buses[network.Lines[l].FromBus].Site != network.Buses[network.Lines[l].ToBus].Site);
        var lines = network.Lines.Select((l, i) => i == tie ? l with { LimitMw = 12.5 } : l).ToArray();
        var other = plan with { Network = new Network(network.BaseMva, network.Buses, lines, network.Generators) };
        Assert.NotEqual(digest, new SetupBuilder(other).Coordinator.SetupDigest);
    }

    [Theory]
    [InlineData(SchemeKind.Injection)]
    [InlineData(SchemeKind.Angle)]
    public void Setups_survive_their_json(SchemeKind kind)
    {
        var setups = new SetupBuilder(InventedPlans.Make(5, 4, 2, 1) with { Scheme = new SchemeSettings { Kind = kind } });
        var json = SetupJson.Write(setups.Coordinator);
        var coordinator = SetupJson.ReadCoordinator(json);
        Assert.Equal(json, SetupJson.Write(coordinator));
        Assert.Equal(setups.Coordinator.Sites.SelectMany(s => s.Components), coordinator.Sites.SelectMany(s => s.Components));
        Assert.Equal(setups.Coordinator.Lines, coordinator.Lines);
        Assert.Equal(setups.Coordinator with { Sites = [], Buses = [], Lines = [] }, coordinator with { Sites = [], Buses = [], Lines = [] });
        foreach (var name in setups.Coordinator.Sites.Select(site => site.Name))
        {
            var setup = setups.ForSite(name);
            var read = SetupJson.ReadSite(SetupJson.Write(setup));
            Assert.Equal(setup.Buses, read.Buses);
            Assert.Equal(setup.Generators, read.Generators);
            Assert.Equal(setup.Lines, read.Lines);
            Assert.Equal(setup.Copies, read.Copies);
            Assert.Equal(Bare(setup), Bare(read));
        }
    }

    private static SiteSetup Bare(SiteSetup setup) => setup with { Buses = [], Generators = [], Lines = [], Copies = [] };

    [Fact]
    public void A_setup_with_an_unknown_key_or_without_a_needed_one_is_refused()
    {
        var json = SetupJson.Write(new SetupBuilder(SmallPlan.Of(2, 1)).ForSite("s0"));
        Assert.Throws<JsonException>(() => SetupJson.ReadSite(json.Replace("\"site\"", "\"sight\"", StringComparison.Ordinal)));
        Assert.Throws<JsonException>(() => SetupJson.ReadSite("{" + "\"extra\": 1," + json[1..]));
        Assert.Throws<JsonException>(() => SetupJson.ReadSite("null"));
        Assert.Throws<JsonException>(() => SetupJson.ReadCoordinator(json));
    }

    [Fact]
    public void The_price_scale_covers_nine_tenths_of_the_adjustable_capacity()
    {
        // Marginal costs at full output: 10 + 2 · 0.05 · 60 = 16 on 60 MW, 20 on 30 MW, 50 on 10 MW. A fixed plant counts for nothing.
        Generator[] plants = [Plant("a", 0, 60, 0.05, 10), Plant("b", 10, 40, 0, 20), Plant("c", 0, 10, 0, 50), Plant("d", 500, 500, 0, 1)];
        Assert.Equal(20, PriceScale.Of(plants));
        Assert.Equal(50, PriceScale.Of([.. plants, Plant("e", 0, 1, 0, 50)]));
        Assert.Equal(0.001, PriceScale.Of([Plant("free", 0, 100, 0, 0)]));
        Assert.Equal(0.001, PriceScale.Of([Plant("fixed", 100, 100, 0, 30)]));
        Assert.Equal(0.001, PriceScale.Of([]));
    }

    [Fact]
    public void The_penalty_of_a_bus_is_the_price_scale_over_its_range()
    {
        var small = SmallPlan.Of(3, 1);
        Generator[] plants = [Plant("a", 0, 60, 0, 40), Plant("b", -10, 30, 0, 40), Plant("c", 25, 25, 0, 5) with { Bus = 1 }];
        var network = new Network(100, small.Network.Buses, small.Network.Lines, plants);
        Assert.Equal([40 / 100.0, 0, 0, 0], InjectionPenalty.Of(network, 40, 1));
        Assert.Equal([3 * 40 / 100.0, 0, 0, 0], InjectionPenalty.Of(network, 40, 3), (a, b) => Math.Abs(a - b) < 1e-12);
        var setups = new SetupBuilder(small with { Network = network });
        Assert.Equal(40, setups.PriceScalePerMwh);
        Assert.Equal(0.4, setups.Coordinator.Sites[0].Components[0].Penalty);
        Assert.Equal(2 * (60 + 30 + 25), setups.Coordinator.Sites[0].Components[0].Bound);
    }

    [Fact]
    public void The_weight_of_a_copy_follows_its_rule()
    {
        // A ring of four one-bus sites, every line 1000 MW/rad: own buses are touched by 2000, foreign ones by 1000.
        var small = SmallPlan.Of(2, 2) with { Scheme = new SchemeSettings { Kind = SchemeKind.Angle, PriceScalePerMwh = 30 } };
        var copies = new SetupBuilder(small).ForSite("s0").Copies;
        Assert.Equal(["b0", "b1", "b3"], copies.Select(copy => copy.Bus).Order());
        var mean = (2000 + 1000 + 1000) / 3.0;
        foreach (var copy in copies)
        {
            Assert.Equal(copy.Bus == "b0" ? 2000 : 1000, copy.MwPerRad, 1e-9);
            Assert.Equal(3 * (30 / 100.0) * mean * copy.MwPerRad, copy.WeightPerRad2h, 1e-3);
        }
    }

    [Fact]
    public void The_reference_load_is_the_plans_or_half_the_installed_capacity()
    {
        var plan = SmallPlan.Of(3, 1);
        Assert.Equal(100, new SetupBuilder(plan).ReferenceLoadMw);
        Assert.Equal(0.5, new SetupBuilder(plan).Coordinator.MismatchLimitMw);
        Assert.Equal(150, new SetupBuilder(plan with { Stop = new StopSettings() }).ReferenceLoadMw);
    }

    [Fact]
    public void A_site_that_the_plan_does_not_have_is_an_error() =>
        Assert.Throws<ArgumentException>(() => new SetupBuilder(SmallPlan.Of(2, 1)).ForSite("nowhere"));

    private static Generator Plant(string name, double min, double max, double quadratic, double linear) => new(name, 0, min, max, quadratic, linear);

    /// <summary>Six buses at three sites; plants, costs and loads are marked so that a leak shows.</summary>
    private static Plan Marked(SchemeKind kind)
    {
        var small = SmallPlan.Of(4, 2);
        var buses = small.Network.Buses.Select((bus, b) => bus with { Site = $"t{b / 2}" }).ToArray();
        var plants = small.Network.Generators.Select((g, i) => g with
        {
            Name = $"plant-{i}",
            CostLinear = 20.271828 + i,
            CostQuadratic = 0.0271828,
            CostFixed = 3.271828,
        }).ToArray();
        return small with
        {
            Scheme = new SchemeSettings { Kind = kind, PriceScalePerMwh = 25 },
            Network = new Network(100, buses, small.Network.Lines, plants),
            Loads = buses.Select(bus => bus.Site).Distinct().ToDictionary(site => site, _ => new LoadSeries([], [[10.618033, 12.618033]])),
        };
    }

    private static IEnumerable<string> PropertyNames(string json)
    {
        using var document = JsonDocument.Parse(json);
        return Walk(document.RootElement).Distinct().ToArray();

        static IEnumerable<string> Walk(JsonElement element) => element.ValueKind switch
        {
            JsonValueKind.Object => element.EnumerateObject().SelectMany(p => Walk(p.Value).Prepend(p.Name)),
            JsonValueKind.Array => element.EnumerateArray().SelectMany(Walk),
            _ => [],
        };
    }
}
