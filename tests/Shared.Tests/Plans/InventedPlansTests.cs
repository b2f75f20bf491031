using Halfvoice.Grid;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

public class InventedPlansTests
{
    [Theory]
    [InlineData(3, 1)]
    [InlineData(12, 1)]
    [InlineData(118, 1)]
    [InlineData(20, 4)]
    [InlineData(5000, 1)]
    public void An_invented_plan_survives_writing_and_reading_without_a_warning(int sites, int busesPerSite)
    {
        var plan = InventedPlans.Make(sites, 42, busesPerSite);
        Assert.Equal(sites, plan.Network.Sites.Count);
        Assert.Equal(sites * busesPerSite, plan.Network.Buses.Count);
        var reading = PlanReader.Read(new MemoryPlanFiles(PlanWriter.Write(plan)));
        Assert.Empty(reading.ErrorLines());
        Assert.Empty(reading.Warnings);
        PlanEquality.AssertEqual(plan, reading.Plan!);
    }

    [Fact]
    public void The_same_seed_gives_the_same_plan_and_another_seed_another()
    {
        var first = PlanWriter.Write(InventedPlans.Make(30, 7, 2));
        Assert.Equal(first, PlanWriter.Write(InventedPlans.Make(30, 7, 2)));
        Assert.NotEqual(first["grid/buses.csv"], PlanWriter.Write(InventedPlans.Make(30, 8, 2))["grid/buses.csv"]);
    }

    [Fact]
    public void Networks_of_every_small_size_are_connected_meshed_and_feasible_with_a_line_that_must_bind()
    {
        for (var sites = 3; sites <= 24; sites++)
        {
            for (var seed = 0; seed < 6; seed++)
                AssertPlausible(InventedPlans.Make(sites, (1000 * sites) + seed, 1 + (seed % 3), 3), lpSnapshots: 3);
        }
    }

    [Theory]
    [InlineData(118, 1)]
    [InlineData(118, 2)]
    [InlineData(400, 3)]
    public void Larger_networks_are_too(int sites, int seed) => AssertPlausible(InventedPlans.Make(sites, seed), lpSnapshots: 2);

    [Fact]
    public void Some_line_is_full_at_the_optimum_that_an_lp_solver_finds()
    {
        for (var seed = 0; seed < 10; seed++)
        {
            var plan = InventedPlans.Make(15, seed);
            var free = DispatchByLp.CheapestCost(plan.Network, plan.LoadMw(1), double.PositiveInfinity, pieces: 50)!.Value;
            var limited = DispatchByLp.CheapestCost(plan.Network, plan.LoadMw(1), 1, pieces: 50)!.Value;
            Assert.True(limited > free * (1 + 1e-7), FormattableString.Invariant($"Seed {seed}: limits cost nothing ({free} against {limited} $/h)."));
        }
    }

    [Fact]
    public void Most_sites_have_load_alone_and_the_plants_are_of_every_kind()
    {
        var plan = InventedPlans.Make(200, 3);
        var network = plan.Network;
        var loadOnly = network.Sites.Count(site => network.BusesOf(site).All(bus => network.GeneratorsAt(bus).Count == 0));
        Assert.InRange(loadOnly, 0.55 * 200, 0.60 * 200);
        Assert.Contains(network.Generators, plant => plant.CostQuadratic > 0 && plant.MinMw >= 0);
        Assert.Contains(network.Generators, plant => plant is { CostQuadratic: 0, CostLinear: > 0 });
        Assert.Contains(network.Generators, plant => plant is { CostQuadratic: 0, CostLinear: 0, MinMw: 0 });
        Assert.Contains(network.Generators, plant => plant.MinMw == plant.MaxMw);
        Assert.Contains(network.Generators, plant => plant.MinMw < 0);
        Assert.InRange(network.Generators.Sum(plant => plant.MaxMw) / plan.LoadMw(1).Sum(), 1.45, 1.85);
        var names = plan.Network.Buses.Select(bus => bus.Name).ToArray();
        Assert.Equal(names.Length, names.Distinct(StringComparer.OrdinalIgnoreCase).Count());
    }

    [Fact]
    public void Loads_drift_gently_over_twelve_snapshots()
    {
        var plan = InventedPlans.Make(50, 9);
        Assert.All(plan.Loads.Values, series => Assert.Equal(12, series.Count));
        var totals = Enumerable.Range(1, 12).Select(cycle => plan.LoadMw(cycle).Sum()).ToArray();
        Assert.All(totals, total => Assert.InRange(total / totals[0], 0.94, 1.06));
        Assert.NotEqual(totals[0], totals[^1]);
    }

    [Fact]
    public void Areas_of_several_buses_are_contiguous()
    {
        var network = InventedPlans.Make(25, 11, 6).Network;
        foreach (var site in network.Sites)
        {
            var own = network.BusesOf(site).ToList();
            var inside = network.Lines
                .Where(line => own.Contains(line.FromBus) && own.Contains(line.ToBus))
                .Select(line => line with { FromBus = own.IndexOf(line.FromBus), ToBus = own.IndexOf(line.ToBus) })
                .ToArray();
            Assert.Single(Islands.Of(new Network(100, [.. own.Select(bus => network.Buses[bus])], inside, [])));
        }

        Assert.InRange(network.Sites.Max(site => network.BusesOf(site).Count), 2, 24);
    }

    [Theory]
    [InlineData(2, 1, 12)]
    [InlineData(5001, 1, 12)]
    [InlineData(3, 0, 12)]
    [InlineData(3, 21, 12)]
    [InlineData(3, 1, 0)]
    [InlineData(3, 1, 289)]
    public void Arguments_outside_their_range_are_refused(int sites, int busesPerSite, int snapshots) =>
        Assert.Throws<ArgumentOutOfRangeException>(() => InventedPlans.Make(sites, 1, busesPerSite, snapshots));

    private static void AssertPlausible(Plan plan, int lpSnapshots)
    {
        var network = plan.Network;
        var told = plan.Name;
        Assert.Single(Islands.Of(network));
        Assert.True(network.Lines.Count >= network.Buses.Count, $"{told} is a tree.");
        for (var cycle = 1; cycle <= lpSnapshots; cycle++)
        {
            // Limits 2 % tighter leave it feasible: that is the room. Without limits the cheapest dispatch breaks one,
            // which by convexity means that one binds.
            Assert.True(DispatchByLp.CheapestCost(network, plan.LoadMw(cycle), 0.98) is not null, $"{told} is infeasible in snapshot {cycle}.");
            Assert.True(OverloadWithoutLimits(network, plan.LoadMw(cycle)) > 1.01, $"{told} has no line that must bind in snapshot {cycle}.");
        }
    }

    /// <summary>Largest loading in the cheapest dispatch without limits; flows by a dense factorisation.</summary>
    private static double OverloadWithoutLimits(Network network, double[] loadMw)
    {
        var output = MeritOrderCheck.Dispatch(network.Generators, loadMw.Sum());
        var injection = Array.ConvertAll(loadMw, load => -load);
        for (var g = 0; g < output.Length; g++)
            injection[network.Generators[g].Bus] += output[g];
        var flow = MeritOrderCheck.DenseFlows(network, injection);
        return flow.Select((value, l) => Math.Abs(value) / network.Lines[l].LimitMw).Max();
    }
}
