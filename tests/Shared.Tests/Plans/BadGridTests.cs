namespace Halfvoice.Tests.Plans;

/// <summary>Every way in which the grid files can be wrong, each with file, line, field, value and rule.</summary>
public class BadGridTests
{
    private const string Buses = "grid/buses.csv", Lines = "grid/lines.csv", Generators = "grid/generators.csv";

    [Theory]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,0,50", "grid/lines.csv:2:4: reactance_pu is '0': must not be zero")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,1e-12,50", "grid/lines.csv:2:4: reactance_pu is '1e-12': must be at least 1e-9 per unit away from zero")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,1e7,50", "grid/lines.csv:2:4: reactance_pu is '1e7': must be at least -1,000,000, at most 1,000,000 per unit")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,,50", "grid/lines.csv:2:4: reactance_pu is '': must not be blank")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,NaN,50", "grid/lines.csv:2:4: reactance_pu is 'NaN': must be a number, not NaN")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,Infinity,50", "grid/lines.csv:2:4: reactance_pu is 'Infinity': must be finite")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,1e999,50", "grid/lines.csv:2:4: reactance_pu is '1e999': must be finite")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,\"0,1\",50", "grid/lines.csv:2:4: reactance_pu is '0,1': must be a number with a decimal point")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,0.1,-50", "grid/lines.csv:2:5: limit_mw is '-50': must be above 0, at most 10,000,000 MW")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,0.1,0", "grid/lines.csv:2:5: limit_mw is '0': must be above 0 MW: leave it empty for no limit")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,0.1,inf", "grid/lines.csv:2:5: limit_mw is 'inf': must be a number")]
    [InlineData(Lines, "L1,A,B,0.1,50", "L1,A,B,0.1,Infinity", "grid/lines.csv:2:5: limit_mw is 'Infinity': must be finite: leave it empty for no limit")]
    [InlineData(Lines, "L2,B,C,0.2,", "L1,B,C,0.2,", "grid/lines.csv:3:1: line is 'L1': is there twice, first in line 2")]
    [InlineData(Lines, "L2,B,C,0.2,", "L2,B,B,0.2,", "grid/lines.csv:3:3: to_bus is 'B': must not be the bus that the line starts from")]
    [InlineData(Lines, "L2,B,C,0.2,", "L2,B,D,0.2,", "grid/lines.csv:3:3: to_bus is 'D': must be a bus of grid/buses.csv")]
    [InlineData(Lines, "L2,B,C,0.2,", "L2,,C,0.2,", "grid/lines.csv:3:2: from_bus is '': must not be blank")]
    [InlineData(Lines, "L2,B,C,0.2,", "L2,B,C,0.2", "grid/lines.csv:3: has 4 fields where the header has 5")]
    [InlineData(Lines, "L2,B,C,0.2,", "\"L\"2,B,C,0.2,", "grid/lines.csv:3:1: has text after a closing quotation mark")]
    [InlineData(Lines, "L2,B,C,0.2,", "L\"2,B,C,0.2,", "grid/lines.csv:3:1: has a quotation mark inside a field")]
    [InlineData(Lines, "L3,A,C,-0.3,40", "L3,A,C,-0.3,\"40", "grid/lines.csv:4:5: has a quotation mark that is never closed")]
    [InlineData(Lines, "reactance_pu", "reactance", "grid/lines.csv:1:4: column is 'reactance': is not known: did you mean 'reactance_pu'?")]
    [InlineData(Lines, "reactance_pu", "reactance", "grid/lines.csv:1: has no column 'reactance_pu'")]
    [InlineData(Lines, "limit_mw", "line", "grid/lines.csv:1:5: column is 'line': is there twice")]
    [InlineData(Generators, "G1,A,0,100", "G1,A,200,100", "grid/generators.csv:2:3: min_mw is '200': must not be above max_mw, which is '100'")]
    [InlineData(Generators, "G1,A,0,100,0.1", "G1,A,0,100,-0.1", "grid/generators.csv:2:5: cost_quadratic is '-0.1': must be at least 0")]
    [InlineData(Generators, "G1,A,0,100,0.1,20,0", "G1,A,0,100,0.1,1e7,0", "grid/generators.csv:2:6: cost_linear is '1e7': must be at least -1,000,000")]
    [InlineData(Generators, "G1,A,0,100,0.1,20,0", "G1,A,0,100,0.1,20,1e13", "grid/generators.csv:2:7: cost_fixed is '1e13': must be at least")]
    [InlineData(Generators, "G1,A,0,100", "G1,A,-2e6,100", "grid/generators.csv:2:3: min_mw is '-2e6': must be at least -1,000,000")]
    [InlineData(Generators, "G1,A,0,100", "G1,A,0,2e6", "grid/generators.csv:2:4: max_mw is '2e6': must be at least -1,000,000")]
    [InlineData(Generators, "G2,C", "G1,C", "grid/generators.csv:3:1: generator is 'G1': is there twice, first in line 2")]
    [InlineData(Generators, "G2,C", "G2,X", "grid/generators.csv:3:2: bus is 'X': must be a bus of grid/buses.csv")]
    [InlineData(Generators, "G2,C", ",C", "grid/generators.csv:3:1: generator is '': must not be blank")]
    [InlineData(Buses, "B,south,,2,3", "A,north,,2,3", "grid/buses.csv:3:1: bus is 'A': is there twice, first in line 2")]
    [InlineData(Buses, "B,south,,2,3", "A,south,,2,3", "grid/buses.csv:3:1: bus is 'A': is given to site 'south' here and to site 'north' in line 2")]
    [InlineData(Buses, "B,south,,2,3", "B,South,,2,3", "grid/buses.csv:4:2: site is 'south': differs only in case from site 'South' in line 3")]
    [InlineData(Buses, "B,south,,2,3", "B,so/uth,,2,3", "grid/buses.csv:3:2: site is 'so/uth': must be 1 to 63 letters, digits, '.', '_' or '-'")]
    [InlineData(Buses, "B,south,,2,3", "B,..,,2,3", "grid/buses.csv:3:2: site is '..': must be 1 to 63 letters")]
    [InlineData(Buses, "B,south,,2,3", "B,,,2,3", "grid/buses.csv:3:2: site is '': must not be blank")]
    [InlineData(Buses, "B,south,,2,3", "B,south,,2e6,3", "grid/buses.csv:3:4: x is '2e6': must be at least -1,000,000, at most 1,000,000 km")]
    [InlineData(Buses, "B,south,,2,3", "B,south,,2,NaN", "grid/buses.csv:3:5: y is 'NaN': must be a number, not NaN")]
    [InlineData(Buses, "bus,site,name,x,y", "a,b,c,d,e", "grid/buses.csv:1:1: has no known column: the first row must be the header 'bus,site,name,x,y'")]
    [InlineData(Buses, "bus,site,name,x,y", "bus,area,name,x,y", "grid/buses.csv:1: has no column 'site'")]
    public void A_wrong_entry_is_an_error_with_place_value_and_rule(string file, string old, string replacement, string expected)
    {
        Assert.Contains(
            new PlanTexts().Replacing(file, old, replacement).Errors(),
            text => text.StartsWith(expected, StringComparison.Ordinal));
    }

    [Theory]
    [InlineData("L1,A,B,0.1,50,0.01,40", "grid/lines.csv:2:7: emergency_limit_mw is '40': must not be below limit_mw")]
    [InlineData("L1,A,B,0.1,50,0.01,-4", "grid/lines.csv:2:7: emergency_limit_mw is '-4': must be above 0")]
    [InlineData("L1,A,B,0.1,50,x,60", "grid/lines.csv:2:6: resistance_pu is 'x': must be a number")]
    [InlineData("L1,A,B,0.1,50,2e6,60", "grid/lines.csv:2:6: resistance_pu is '2e6': must be at least -1,000,000")]
    public void Optional_line_columns_have_rules_too(string row, string expected)
    {
        var error = new PlanTexts().With(Lines,
            $"line,from_bus,to_bus,reactance_pu,limit_mw,resistance_pu,emergency_limit_mw\n{row}\nL2,B,C,0.2,,,\n").OnlyError();
        Assert.StartsWith(expected, error, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData(Buses)]
    [InlineData(Lines)]
    [InlineData(Generators)]
    [InlineData("plan.yaml")]
    public void A_missing_file_is_one_error_and_no_flood_of_unknown_buses(string file)
    {
        Assert.Equal($"{file}: is missing", new PlanTexts().Without(file).OnlyError());
    }

    [Theory]
    [InlineData(Buses)]
    [InlineData(Lines)]
    [InlineData(Generators)]
    public void An_empty_file_asks_for_its_header(string file)
    {
        Assert.StartsWith($"{file}:1:1: is empty: it needs a header row", new PlanTexts().With(file, "").OnlyError(), StringComparison.Ordinal);
    }

    [Fact]
    public void A_bus_list_without_buses_is_an_error()
    {
        Assert.Contains(
            "grid/buses.csv: has no bus: a plan needs at least one",
            new PlanTexts().With(Buses, "bus,site\n").Errors());
    }

    [Fact]
    public void A_broken_bus_row_draws_no_error_where_the_bus_is_used()
    {
        Assert.StartsWith(
            "grid/buses.csv:3: has 4 fields where the header has 5",
            new PlanTexts().Replacing(Buses, "B,south,,2,3", "B,south,,2").OnlyError(),
            StringComparison.Ordinal);
    }

    [Fact]
    public void An_island_with_load_but_no_generator_is_named_by_its_buses()
    {
        var error = new PlanTexts().With(Lines, "line,from_bus,to_bus,reactance_pu,limit_mw\nL3,A,C,0.3,\n").OnlyError();
        Assert.Equal(
            "grid/lines.csv: leaves an island with load but without a generator: buses B: join it to the rest, or give it a generator",
            error);
    }

    [Fact]
    public void An_island_whose_generators_cannot_meet_its_load_is_named_by_its_buses()
    {
        var error = new PlanTexts()
            .With(Lines, "line,from_bus,to_bus,reactance_pu,limit_mw\nL2,B,C,0.3,\n")
            .With("loads/south.csv", "bus,load_mw\nB,60\n")
            .OnlyError();
        Assert.StartsWith("grid/lines.csv: leaves an island whose generators cannot meet its load: buses B, C", error, StringComparison.Ordinal);
        Assert.DoesNotContain("60", error, StringComparison.Ordinal);
    }

    [Fact]
    public void All_errors_of_all_files_come_at_once_sorted_by_file_and_line()
    {
        var errors = new PlanTexts()
            .Replacing("plan.yaml", "100", "-1")
            .Replacing(Buses, "A town,0,1", "A town,zero,1")
            .Replacing(Lines, "L1,A,B,0.1,50", "L1,A,B,0,-50")
            .Replacing(Lines, "L3,A,C", "L3,A,Q")
            .Replacing(Generators, "G2,C,-5,50", "G2,C,-5,")
            .Replacing("loads/north.csv", "A,10.5", "A,much")
            .Errors();
        Assert.Equal(
            [
                "grid/buses.csv:2:4", "grid/generators.csv:3:4", "grid/lines.csv:2:4", "grid/lines.csv:2:5", "grid/lines.csv:4:3",
                "loads/north.csv:2:2", "plan.yaml:2:11",
            ],
            errors.Select(text => string.Join(':', text.Split(':').Take(3))));
    }
}
