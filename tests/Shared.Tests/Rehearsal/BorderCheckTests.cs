using Halfvoice.Grid;
using Halfvoice.Plans;
using Halfvoice.Rehearsal;
using Halfvoice.Tests.Coordination;

namespace Halfvoice.Tests.Rehearsal;

/// <summary>Sites whose load no border can bring in.</summary>
public class BorderCheckTests
{
    [Fact]
    public void A_load_beyond_plants_and_border_limits_is_found_in_its_worst_cycle()
    {
        // Each site of the ring has two border lines of 4 MW; site s2 has loads of 7.5 and 9.5 MW and no plant.
        var small = SmallPlan.Of(2, 1);
        var lines = small.Network.Lines.Select(line => line with { LimitMw = 4 }).ToArray();
        var plan = small with
        {
            Network = new Network(100, small.Network.Buses, lines, small.Network.Generators),
            Loads = new Dictionary<string, LoadSeries>(small.Loads) { ["s2"] = new LoadSeries([], [[7.5], [9.5], [7]]) },
        };
        var (site, shortMw) = Assert.Single(BorderCheck.Shortfalls(plan));
        Assert.Equal("s2", site);
        Assert.Equal(1.5, shortMw, 1e-9);
    }

    [Fact]
    public void A_line_within_a_site_brings_nothing_in_and_one_without_a_limit_anything()
    {
        var small = SmallPlan.Of(1, 2);
        var buses = small.Network.Buses.Select((bus, b) => bus with { Site = b == 0 ? "a" : "b" }).ToArray();
        var loads = new Dictionary<string, LoadSeries> { ["a"] = new([], [[0]]), ["b"] = new([], [[6, 6]]) };
        Assert.Equal(2, Assert.Single(Shortfalls(5)).ShortMw, 1e-9);
        Assert.Empty(Shortfalls(double.PositiveInfinity));

        IReadOnlyList<(string Site, double ShortMw)> Shortfalls(double limitMw)
        {
            Line[] lines = [new("in", 0, 1, 0.1, limitMw), new("within", 1, 2, 0.1, 100), new("in2", 2, 0, 0.1, 5)];
            return BorderCheck.Shortfalls(small with { Network = new Network(100, buses, lines, small.Network.Generators), Loads = loads });
        }
    }
}
