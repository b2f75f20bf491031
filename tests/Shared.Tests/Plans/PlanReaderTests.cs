using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

public class PlanReaderTests
{
    [Fact]
    public void The_small_plan_reads_with_every_default()
    {
        var reading = new PlanTexts().Read();
        Assert.Empty(reading.Errors);
        Assert.Empty(reading.Warnings);
        var plan = reading.Plan!;
        Assert.Equal("Small", plan.Name);
        Assert.Equal(100, plan.Network.BaseMva);
        Assert.Equal(new SchemeSettings(), plan.Scheme);
        Assert.Equal(new StopSettings(), plan.Stop);
        Assert.Equal(new PrivacySettings(), plan.Privacy);
        Assert.Equal(new RoundSettings(), plan.Rounds);
        Assert.Equal(new AcceptSettings(), plan.Accept);
        Assert.Equal(LinkProfiles.Local, plan.Links.For("north"));
        Assert.Equal(["north", "south"], plan.Network.Sites);
        Assert.Equal([10.5, 20, -3], plan.LoadMw(1));
        Assert.Equal(double.PositiveInfinity, plan.Network.Lines[1].LimitMw);
        Assert.Equal(-0.3, plan.Network.Lines[2].ReactancePu);
        Assert.Equal("A town", plan.Network.Buses[0].Label);
        Assert.Null(plan.Network.Buses[2].X);
        Assert.Equal(-5, plan.Network.Generators[1].MinMw);
    }

    [Fact]
    public void Columns_may_come_in_any_order_quoted_and_with_any_line_ends()
    {
        var plan = new PlanTexts()
            .With("grid/buses.csv", "\uFEFFsite,\"bus\"\r\nnorth, A \r\n\r\nsouth,\"B, \"\"upper\"\"\"\rsouth,C")
            .With("grid/lines.csv", "limit_mw,line,from_bus,to_bus,reactance_pu\n50,L1,A,C,0.1\n,L2,C,\"B, \"\"upper\"\"\",.2\n")
            .With("loads/south.csv", "load_mw,bus\n1e1,C\n")
            .Read().Plan!;
        Assert.Equal(["A", "B, \"upper\"", "C"], plan.Network.Buses.Select(bus => bus.Name));
        Assert.Equal([10.5, 0, 10], plan.LoadMw(1));
    }

    [Fact]
    public void The_demo_plan_reads_without_a_warning()
    {
        var reading = PlanFolders.Read(PlanFolders.Demo);
        Assert.Empty(reading.ErrorLines());
        Assert.Empty(reading.Warnings);
        var plan = reading.Plan!;
        Assert.Equal(12, plan.Network.Sites.Count);
        Assert.Equal(19, plan.Network.Buses.Count);
        Assert.Equal(3, plan.Cycles);
        Assert.All(plan.Loads.Values, series => Assert.Equal(6, series.Count));
        Assert.All(plan.Network.Buses, bus => Assert.NotNull(bus.X));
        var upper = plan.Links.For("upper-hydro");
        Assert.Equal(TimeSpan.FromMilliseconds(600), upper.RoundTrip);
        Assert.Equal(TimeSpan.FromMilliseconds(40), upper.Jitter);
        Assert.Equal(LinkProfiles.ByName["lte"].LossFraction, upper.LossFraction);
        Assert.Equal(LinkProfiles.ByName["lte"], plan.Links.For("dairy"));
        Assert.True(plan.Privacy.Stated);
    }

    [Fact]
    public void The_sample_plan_reads_without_a_warning()
    {
        var reading = PlanFolders.Read(PlanFolders.Sample);
        Assert.Empty(reading.ErrorLines());
        Assert.Empty(reading.Warnings);
        Assert.Equal(SchemeKind.Angle, reading.Plan!.Scheme.Kind);
        Assert.Equal(MechanismKind.None, reading.Plan.Privacy.Mechanism);
        Assert.Equal([12.0, 49, 95], reading.Plan.LoadMw(2));
    }

    [Theory]
    [InlineData("ieee-14", 14, 20, 14, 259.0)]
    [InlineData("ieee-118", 118, 186, 118, 4242.0)]
    [InlineData("ieee-118-areas", 118, 186, 8, 4242.0)]
    public void Published_networks_read(string name, int buses, int lines, int sites, double loadMw)
    {
        var reading = PlanFolders.Read(PlanFolders.Case(name));
        Assert.Empty(reading.ErrorLines());
        Assert.Equal(buses, reading.Plan!.Network.Buses.Count);
        Assert.Equal(lines, reading.Plan.Network.Lines.Count);
        Assert.Equal(sites, reading.Plan.Network.Sites.Count);
        Assert.Equal(loadMw, reading.Plan.LoadMw(1).Sum(), 6);
    }

    [Fact]
    public void Loads_over_time_become_snapshots_in_order()
    {
        var plan = new PlanTexts()
            .With("loads/south.csv", "time,bus,load_mw\n08:00,B,1\n08:00,C,2\n08:05,C,4\n08:05,B,3\n")
            .Read().Plan!;
        Assert.Equal(["08:00", "08:05"], plan.Loads["south"].Times);
        Assert.Equal([10.5, 1, 2], plan.LoadMw(1));
        Assert.Equal([10.5, 3, 4], plan.LoadMw(2));
        Assert.Equal([10.5, 3, 4], plan.LoadMw(9));
    }

    [Theory]
    [InlineData("2031-04-02T08:00", "2031-04-02T08:05")]
    [InlineData("2031-04-02T08:00:00Z", "2031-04-02T08:05:00Z")]
    [InlineData("2031-04-02T08:00:00+02:00", "2031-04-02T08:05:00+02:00")]
    [InlineData("2031-04-02 23:55", "2031-04-03 00:00")]
    public void Times_may_be_dates_of_iso_8601(string first, string second)
    {
        var reading = new PlanTexts()
            .With("loads/north.csv", $"time,bus,load_mw\n{first},A,1\n{second},A,2\n")
            .Read();
        Assert.Empty(reading.ErrorLines());
        Assert.Empty(reading.Warnings);
        Assert.Equal([first, second], reading.Plan!.Loads["north"].Times);
    }

    [Fact]
    public void A_site_without_a_load_file_has_no_load()
    {
        var plan = new PlanTexts().Without("loads/south.csv").Read().Plan!;
        Assert.Equal([10.5, 0, 0], plan.LoadMw(1));
    }

    [Fact]
    public void Two_islands_that_balance_are_accepted_with_a_warning()
    {
        var reading = new PlanTexts()
            .With("grid/lines.csv", "line,from_bus,to_bus,reactance_pu,limit_mw\nL2,B,C,0.2,\n")
            .Read();
        Assert.Empty(reading.Errors);
        Assert.Contains("2 islands", Assert.Single(reading.Warnings).Text, StringComparison.Ordinal);
    }

    [Fact]
    public void Files_that_are_not_read_are_pointed_out()
    {
        var reading = new PlanTexts().With("grid/line.csv", "x").With("loads/notes.txt", "x").Read();
        Assert.Empty(reading.Errors);
        Assert.Equal(
            ["grid/line.csv: is not read: did you mean 'grid/lines.csv'?", "loads/notes.txt: is not read: load files end in .csv"],
            reading.Warnings.Select(warning => warning.Text));
    }

    [Fact]
    public void Snapshots_that_are_not_an_interval_apart_draw_a_warning()
    {
        var reading = new PlanTexts().With("loads/north.csv", "time,bus,load_mw\n08:00,A,1\n08:15,A,2\n").Read();
        Assert.Contains("not one interval (5m) apart", Assert.Single(reading.Warnings).Text, StringComparison.Ordinal);
    }
}
