namespace Halfvoice.Tests.Plans;

public class BadLoadTests
{
    private const string South = "loads/south.csv";

    [Theory]
    [InlineData("bus,load_mw\nB,NaN\n", "loads/south.csv:2:2: load_mw (value not shown: loads are private): must be a number, not NaN")]
    [InlineData("bus,load_mw\nB,-Infinity\n", "loads/south.csv:2:2: load_mw (value not shown: loads are private): must be finite")]
    [InlineData("bus,load_mw\nB,\n", "loads/south.csv:2:2: load_mw (value not shown: loads are private): must not be blank")]
    [InlineData("bus,load_mw\nB,7.77e7\n",
        "loads/south.csv:2:2: load_mw (value not shown: loads are private): must be at least -1,000,000, at most 1,000,000 MW")]
    [InlineData("bus,load_mw\nA,7.77\n", "loads/south.csv:2:1: bus (value not shown: loads are private): must be a bus of this site")]
    [InlineData("bus,load_mw\n7.77,B\n", "loads/south.csv:2:1: bus (value not shown: loads are private): must be a bus of grid/buses.csv")]
    [InlineData("bus,load_mw\n,7.77\n", "loads/south.csv:2:1: bus (value not shown: loads are private): must not be blank")]
    [InlineData("bus,load_mw\nB,7.77\nB,7.77\n", "loads/south.csv:3:1: bus (value not shown: loads are private): is there twice")]
    [InlineData("bus,load_mw\nB,7.77,\n", "loads/south.csv:2: has 3 fields where the header has 2")]
    [InlineData("bus,load_mw,7.77\nB,1,1\n", "loads/south.csv:1:3: column (value not shown: loads are private): is not known")]
    [InlineData("B,7.77\n", "loads/south.csv:1:1: has no known column")]
    [InlineData("bus,mw\nB,7.77\n", "loads/south.csv:1: has no column 'load_mw'")]
    [InlineData("time,bus,load_mw\n8:00,B,7.77\n", "loads/south.csv:2:1: time (value not shown: loads are private): must be a time such as 08:05")]
    [InlineData("time,bus,load_mw\n,B,7.77\n", "loads/south.csv:2:1: time (value not shown: loads are private): must be a time such as 08:05")]
    [InlineData("time,bus,load_mw\n08:05,B,7.77\n08:00,B,7.77\n",
        "loads/south.csv:3:1: time (value not shown: loads are private): must be later than the time that starts in line 2")]
    [InlineData("time,bus,load_mw\n08:05,B,7.77\n2031-01-01T08:10,B,7.77\n",
        "loads/south.csv:3:1: time (value not shown: loads are private): must be written in the same way")]
    [InlineData("time,bus,load_mw\n08:05,B,7.77\n08:05,B,7.77\n",
        "loads/south.csv:3:2: bus (value not shown: loads are private): is there twice at the same time")]
    [InlineData("time,bus,load_mw\n08:00,B,7.77\n08:00,C,7.77\n08:05,B,7.77\n", "loads/south.csv:4: starts a snapshot without bus 'C'")]
    [InlineData("time,bus,load_mw\n08:00,B,7.77\n08:05,B,7.77\n08:05,C,7.77\n", "loads/south.csv:3: starts a snapshot with bus 'C'")]
    public void A_wrong_load_is_an_error_that_quotes_no_value(string text, string expected)
    {
        var errors = new PlanTexts().With(South, text).Errors();
        Assert.Contains(errors, error => error.StartsWith(expected, StringComparison.Ordinal));
        Assert.All(errors, error => Assert.DoesNotContain("7.77", error, StringComparison.Ordinal));
    }

    [Fact]
    public void Sites_with_times_need_the_same_times()
    {
        var error = new PlanTexts()
            .With("loads/north.csv", "time,bus,load_mw\n08:00,A,1\n08:05,A,1\n")
            .With(South, "time,bus,load_mw\n08:00,B,1\n08:10,B,1\n")
            .OnlyError();
        Assert.Equal("loads/south.csv: does not have the same times as loads/north.csv: all sites with times need the same ones", error);
    }

    [Fact]
    public void A_load_file_of_an_unknown_site_is_an_error_with_the_nearest_one()
    {
        Assert.Equal(
            "loads/sourh.csv: belongs to no site of grid/buses.csv: did you mean 'south'?",
            new PlanTexts().With("loads/sourh.csv", "bus,load_mw\n").OnlyError());
    }

    [Fact]
    public void Two_load_files_that_differ_in_case_name_the_same_site()
    {
        Assert.Contains(
            "loads/south.csv: and loads/South.csv name the same site: a site has one load file",
            new PlanTexts().With("loads/South.csv", "bus,load_mw\n").Errors());
    }

    [Fact]
    public void A_load_file_in_another_case_than_its_site_is_an_error()
    {
        Assert.Equal(
            "loads/SOUTH.csv: names site 'south' in another case: call it loads/south.csv",
            new PlanTexts().Without(South).With("loads/SOUTH.csv", "bus,load_mw\n").OnlyError());
    }

    [Fact]
    public void More_snapshots_than_fit_in_memory_are_an_error()
    {
        var rows = string.Concat(Enumerable.Range(0, 2000).Select(i =>
            FormattableString.Invariant($"{new DateTime(2031, 1, 1).AddMinutes(i):yyyy-MM-ddTHH:mm},B1,1\n")));
        var buses = string.Concat(Enumerable.Range(1, 3000).Select(i => FormattableString.Invariant($"B{i},wide\n")));
        var errors = new PlanTexts()
            .With("grid/buses.csv", "bus,site\n" + buses)
            .With("grid/lines.csv", "line,from_bus,to_bus,reactance_pu,limit_mw\n")
            .With("grid/generators.csv", "generator,bus,min_mw,max_mw,cost_quadratic,cost_linear,cost_fixed\n")
            .Without("loads/north.csv").Without(South)
            .With("loads/wide.csv", "time,bus,load_mw\n" + rows)
            .Errors();
        Assert.Contains(errors, error => error.Contains("starts one snapshot too many", StringComparison.Ordinal));
    }
}
