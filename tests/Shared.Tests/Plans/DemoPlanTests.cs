namespace Halfvoice.Tests.Plans;

/// <summary>The plans that the project ships: feasible with room, and with a line that binds in every snapshot.</summary>
public class DemoPlanTests
{
    [Theory]
    [InlineData("sallow-reach", 6)]
    [InlineData("three-fords", 2)]
    public void Every_snapshot_is_feasible_with_limits_five_percent_tighter_and_dearer_with_limits_than_without(string name, int snapshots)
    {
        var plan = PlanFolders.Read(Repository.PathOf("deploy", "plans", name)).Plan!;
        Assert.Equal(snapshots, plan.Loads.Values.Max(series => series.Count));
        for (var cycle = 1; cycle <= snapshots; cycle++)
        {
            var loadMw = plan.LoadMw(cycle);
            Assert.NotNull(DispatchByLp.CheapestCost(plan.Network, loadMw, 0.95));
            var free = DispatchByLp.CheapestCost(plan.Network, loadMw, double.PositiveInfinity, pieces: 100)!.Value;
            var limited = DispatchByLp.CheapestCost(plan.Network, loadMw, 1, pieces: 100)!.Value;
            Assert.True(limited > 1.005 * free, FormattableString.Invariant($"Snapshot {cycle}: {limited} against {free} $/h."));
        }
    }

    [Fact]
    public void The_demo_shows_plants_of_every_kind_sites_of_several_buses_and_a_slow_link()
    {
        var plan = PlanFolders.Read(PlanFolders.Demo).Plan!;
        var network = plan.Network;
        Assert.Contains(network.Generators, plant => plant.CostQuadratic > 0);
        Assert.Contains(network.Generators, plant => plant is { CostQuadratic: 0, CostLinear: > 0 });
        Assert.Contains(network.Generators, plant => plant is { CostQuadratic: 0, CostLinear: 0, MinMw: 0 });
        Assert.Contains(network.Generators, plant => plant.MinMw == plant.MaxMw);
        Assert.Contains(network.Generators, plant => plant.MinMw < 0);
        Assert.Equal(3, network.Sites.Count(site => network.BusesOf(site).Count > 1));
        Assert.InRange(plan.LoadMw(1).Sum(), 600, 900);
        Assert.True(plan.Links.Sites.Values.Max(link => link.RoundTrip) >= TimeSpan.FromMilliseconds(500));
    }
}
