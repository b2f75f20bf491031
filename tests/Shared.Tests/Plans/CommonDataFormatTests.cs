using System.Text;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

public class CommonDataFormatTests
{
    // An invented four-bus case, written to the columns of the paper.
    private static readonly string[] Good =
    [
        " 01/01/31 NOBODY               100.0  2031 S Four invented buses",
        "BUS DATA FOLLOWS                             4 ITEMS",
        "   1 North bank    1  1  3 1.020    0.0      0.0      0.0     95.0     5.0     0.0  1.020     0.0     0.0   0.0    0.0        0",
        "   2 South bank    1  1  0 1.000   -2.5     60.0      6.0      0.0     0.0     0.0  0.0       0.0     0.0   0.0    0.0        0",
        "   3 Far field     2  1  0 0.990   -4.0     50.5      6.0      0.0     0.0     0.0  0.0       0.0     0.0   0.0    0.0        0",
        "   4 Pump house    2  1  2 0.995   -3.0     -4.0      6.0     15.0     0.0     0.0  0.995     0.0     0.0   0.0    0.0        0",
        "-999",
        "BRANCH DATA FOLLOWS                          5 ITEMS",
        "   1    2  1  1 1 0  0.01000   0.10000     0.0200   120     0     0    0 0  0.0       0.0 0.0    0.0     0.0    0.0   0.0",
        "   1    2  1  1 2 0  0.01000   0.10000     0.0200    90     0     0    0 0  0.0       0.0 0.0    0.0     0.0    0.0   0.0",
        "   2    3  1  1 1 0  0.02000   0.20000     0.0200     0     0     0    0 0  0.0       0.0 0.0    0.0     0.0    0.0   0.0",
        "   3    4  1  1 1 1  0.0       0.05000     0.0        0     0     0    0 0  0.978     0.0 0.0    0.0     0.0    0.0   0.0",
        "   1    4  1  1 1 4  0.0      -0.05000     0.0        0     0     0    0 0  1.0       5.0 0.0    0.0     0.0    0.0   0.0",
        "-999",
        "LOSS ZONES FOLLOWS                     0 ITEMS",
        "-99",
        "END OF DATA",
    ];

    [Fact]
    public void A_case_becomes_a_plan_with_a_site_a_bus()
    {
        var reading = Import(Good);
        Assert.Empty(reading.ErrorLines());
        var network = reading.Plan!.Network;
        Assert.Equal("Four invented buses", reading.Plan.Name);
        Assert.Equal(100, network.BaseMva);
        Assert.Equal(["1", "2", "3", "4"], network.Buses.Select(bus => bus.Name));
        Assert.Equal(["North bank", "South bank", "Far field", "Pump house"], network.Buses.Select(bus => bus.Label));
        Assert.Equal(["bus-1", "bus-2", "bus-3", "bus-4"], network.Sites);
        Assert.Equal([0, 60, 50.5, -4], reading.Plan.LoadMw(1));
        Assert.Equal(["1-2", "1-2-2", "2-3", "3-4", "1-4"], network.Lines.Select(line => line.Name));
        Assert.Equal([0.1, 0.1, 0.2, 0.05, -0.05], network.Lines.Select(line => line.ReactancePu));
        Assert.Equal([120, 90, double.PositiveInfinity, double.PositiveInfinity, double.PositiveInfinity], network.Lines.Select(line => line.LimitMw));
        Assert.Equal(["G1", "G4"], network.Generators.Select(plant => plant.Name));
        Assert.Equal([(0.0, 190.0), (0.0, 30.0)], network.Generators.Select(plant => (plant.MinMw, plant.MaxMw)));
        Assert.All(network.Generators, plant => Assert.Equal((20, 40), (plant.MarginalCost(0), plant.MarginalCost(plant.MaxMw))));
    }

    [Fact]
    public void What_the_format_or_the_model_leaves_out_is_said()
    {
        var warnings = Import(Good).Warnings.Select(warning => warning.Text).ToArray();
        Assert.Contains(
            "case.cdf: gives no rating for 3 of 5 branches (0 means not given): they are left without a limit: fill in limit_mw where there is one", warnings);
        Assert.Contains("case.cdf: rates 2 branches in MVA: taken as limits in MW", warnings);
        Assert.Contains("case.cdf: has 1 transformers: the DC model ignores their tap ratios", warnings);
        Assert.Contains("case.cdf: has 1 phase shifters: their shift is ignored, so real flows will differ", warnings);
        Assert.Contains(warnings, text => text.Contains("2 plants got placeholders (typical, unverified: replace them)", StringComparison.Ordinal));
        Assert.Equal(5, warnings.Length);
    }

    [Fact]
    public void Areas_can_be_the_sites()
    {
        var plan = Import(Good, new CommonDataFormatOptions { SitesBy = ImportSites.Area }).Plan!;
        Assert.Equal(["area-1", "area-2"], plan.Network.Sites);
        Assert.Equal([50.5, -4], plan.Loads["area-2"].At(1));
    }

    [Fact]
    public void Plants_of_the_users_own_take_the_place_of_placeholders()
    {
        var csv = "generator,bus,min_mw,max_mw,cost_quadratic,cost_linear,cost_fixed\nBig,1,10,200,0.02,25,100\n"u8.ToArray();
        var reading = Import(Good, new CommonDataFormatOptions { Generators = csv });
        Assert.Equal("Big", Assert.Single(reading.Plan!.Network.Generators).Name);
        Assert.DoesNotContain(reading.Warnings, warning => warning.Text.Contains("placeholder", StringComparison.Ordinal));

        var wrong = "generator,bus,min_mw,max_mw,cost_quadratic,cost_linear,cost_fixed\nBig,7,10,200,0.02,25,100\n"u8.ToArray();
        Assert.StartsWith(
            "mine.csv:2:2: bus is '7': must be a bus of case.cdf",
            Assert.Single(Import(Good, new CommonDataFormatOptions { Generators = wrong, GeneratorsName = "mine.csv" }).Errors).Text,
            StringComparison.Ordinal);
    }

    [Fact]
    public void An_imported_plan_survives_writing_and_reading()
    {
        var plan = Import(Good, new CommonDataFormatOptions { SitesBy = ImportSites.Area }).Plan!;
        var again = PlanReader.Read(new MemoryPlanFiles(PlanWriter.Write(plan)));
        Assert.Empty(again.ErrorLines());
        PlanEquality.AssertEqual(plan, again.Plan!);
    }

    [Fact]
    public void Rows_that_drift_out_of_their_columns_are_read_by_order()
    {
        string[] drifted =
        [
            Good[0].Replace("100.0 ", "  250.0 ", StringComparison.Ordinal), Good[1],
            "   1 North bank    1  1  3  1.020      0.0      0.0         0.0       95.0     5.0     0.0  1.020     0.0     0.0   0.0    0.0        0",
            "10002 South bank East 1  1  0  1.000    -2.5       60.0      6.0      0.0     0.0     0.0  0.0       0.0     0.0   0.0    0.0        0",
            "-999", Good[7],
            "1 10002 1 1 1 0 0.01 0.12 0.02 75 0 0 0 0 0.0 0.0 0.0 0.0 0.0 0.0 0.0",
            "-999", "END OF DATA",
        ];
        var reading = Import(drifted);
        Assert.Empty(reading.ErrorLines());
        var plan = reading.Plan!;
        Assert.Equal(250, plan.Network.BaseMva);
        Assert.Equal(["1", "10002"], plan.Network.Buses.Select(bus => bus.Name));
        Assert.Equal([0, 60], plan.LoadMw(1));
        Assert.Equal(190, Assert.Single(plan.Network.Generators).MaxMw);
        var line = Assert.Single(plan.Network.Lines);
        Assert.Equal((0.12, 75), (line.ReactancePu, line.LimitMw));
        Assert.Contains(reading.Warnings, warning => warning.Text == "case.cdf:2: announces 4 items, but 2 rows follow");
    }

    [Fact]
    public void A_title_without_a_base_is_read_with_a_warning()
    {
        Assert.Contains(
            Import([" no base here", .. Good[1..]]).Warnings,
            warning => warning.Text.StartsWith("case.cdf:1: gives no power base in columns 32 to 37: 100 MVA are assumed", StringComparison.Ordinal));
    }

    [Theory]
    [InlineData(3, "   2", "   1", "case.cdf:4:1: bus number is '1': is there twice, first in line 3")]
    [InlineData(3, "   2", "   x", "case.cdf:4:1: bus number is 'x': must be a whole number in columns 1 to 4")]
    [InlineData(3, "1  1  0 1.000", "1  1  7 1.000", "case.cdf:4:19: cannot be read: after the name come area")]
    [InlineData(3, "   60.0", "    NaN", "case.cdf:4:19: cannot be read")]
    [InlineData(3, "   60.0", "7.777e7", "case.cdf:4:41: load (value not shown: loads are private): must be at least")]
    [InlineData(2, "   95.0", "7.777e7", "case.cdf:3:60: twice the generation: must be at least")]
    [InlineData(8, "0.10000", "0.00000", "case.cdf:9:30: reactance is '0': must not be zero")]
    [InlineData(8, "0.10000", "1.0e+09", "case.cdf:9:30: reactance is '1000000000': must be at least")]
    [InlineData(8, "0.01000", "1.0e+09", "case.cdf:9:20: resistance is '1000000000': must be at least")]
    [InlineData(8, "  120 ", " -120 ", "case.cdf:9:51: rating is '-120': must not be negative")]
    [InlineData(8, "   1    2", "   1    9", "case.cdf:9:6: bus is '9': must be a bus of the bus section")]
    [InlineData(8, "   1    2", "   2    2", "case.cdf:9:6: second bus is '2': must not be the bus that the branch starts from")]
    [InlineData(8, "   1    2", "   a    b", "case.cdf:9:1: cannot be read: a branch is two bus numbers")]
    [InlineData(1, "BUS DATA", "BAD DATA", "case.cdf: has no section 'BUS DATA FOLLOWS'")]
    [InlineData(7, "BRANCH DATA", "BRUNCH DATA", "case.cdf: has no section 'BRANCH DATA FOLLOWS'")]
    public void A_wrong_row_is_an_error_with_its_place(int row, string old, string replacement, string expected)
    {
        var lines = (string[])Good.Clone();
        Assert.Contains(old, lines[row], StringComparison.Ordinal);
        lines[row] = lines[row].Replace(old, replacement, StringComparison.Ordinal);
        var reading = Import(lines);
        Assert.Null(reading.Plan);
        Assert.Contains(reading.Errors, error => error.Text.StartsWith(expected, StringComparison.Ordinal));
        Assert.DoesNotContain(reading.Errors, error => error.Text.Contains("7.777", StringComparison.Ordinal));
    }

    [Fact]
    public void A_file_that_is_cut_off_or_no_text_is_an_error()
    {
        Assert.Contains("no line -999 ends it", Assert.Single(Import(Good[..12]).Errors).Text, StringComparison.Ordinal);
        Assert.StartsWith("case.cdf: is not a text file", CommonDataFormat.Read(new byte[100]).Errors[0].Text, StringComparison.Ordinal);
        Assert.Contains("has no section", CommonDataFormat.Read([]).Errors[0].Text, StringComparison.Ordinal);
        Assert.Contains("MiB large", CommonDataFormat.Read(new byte[PlanFileRules.MaxCsvBytes + 1]).Errors[0].Text, StringComparison.Ordinal);
    }

    [Fact]
    public void An_island_is_reported_for_the_imported_file()
    {
        var error = Import([.. Good[..7], "BRANCH DATA FOLLOWS 2 ITEMS", Good[8], Good[11], "-999"], new CommonDataFormatOptions
        {
            Generators = "generator,bus,min_mw,max_mw,cost_quadratic,cost_linear,cost_fixed\nBig,1,0,200,0,25,0\n"u8.ToArray(),
        }).Errors;
        Assert.StartsWith("case.cdf: leaves an island with load but without a generator: buses 3, 4", Assert.Single(error).Text, StringComparison.Ordinal);
    }

    [Fact]
    public void Damaged_files_end_in_a_plan_or_in_typed_errors()
    {
        var random = new Random(3);
        var original = Encoding.ASCII.GetBytes(string.Join("\r\n", Good));
        var refused = 0;
        for (var trial = 0; trial < 3000; trial++)
        {
            var bytes = (byte[])original.Clone();
            for (var hits = random.Next(1, 6); hits > 0; hits--)
                bytes[random.Next(bytes.Length)] = (byte)random.Next(1, 256);
            if (random.Next(5) == 0)
                bytes = bytes[..random.Next(bytes.Length)];
            var reading = CommonDataFormat.Read(bytes);
            Assert.Equal(reading.Plan is null, reading.Errors.Count > 0);
            Assert.All(reading.Errors, error => Assert.DoesNotContain(error.Text, char.IsControl));
            refused += reading.Plan is null ? 1 : 0;
            if (reading.Plan is { } plan)
                Assert.Empty(PlanReader.Read(new MemoryPlanFiles(PlanWriter.Write(plan))).ErrorLines());
        }

        Assert.InRange(refused, 500, 2900);
    }

    [Fact]
    public void The_published_fourteen_bus_file_reads()
    {
        var reading = CommonDataFormat.Read(File.ReadAllBytes(PlanFolders.Case("cdf", "ieee14cdf.txt")));
        Assert.Empty(reading.ErrorLines());
        var plan = reading.Plan!;
        var published = PlanFolders.Read(PlanFolders.Case("ieee-14")).Plan!;
        Assert.Equal(100, plan.Network.BaseMva);
        Assert.Equal("IEEE 14 Bus Test Case", plan.Name);
        Assert.Equal(published.Network.Buses.Select(bus => bus.Name), plan.Network.Buses.Select(bus => bus.Name));
        Assert.Equal(published.LoadMw(1), plan.LoadMw(1));
        Assert.Equal(
            published.Network.Lines.Select(line => (line.FromBus, line.ToBus)).Order(),
            plan.Network.Lines.Select(line => (line.FromBus, line.ToBus)).Order());

        // The published networks carry (r² + x²) / x; from resistance and reactance of the file it comes out the same.
        foreach (var line in plan.Network.Lines)
        {
            var (r, x) = (line.ResistancePu!.Value, line.ReactancePu);
            var twin = published.Network.Lines.Single(other => other.FromBus == line.FromBus && other.ToBus == line.ToBus);
            Assert.Equal(twin.ReactancePu, ((r * r) + (x * x)) / x, 9);
        }

        Assert.Equal([("G1", 464.8), ("G2", 80.0)], plan.Network.Generators.Select(plant => (plant.Name, plant.MaxMw)));
        Assert.Contains(reading.Warnings, warning => warning.Text.Contains("no rating for 20 of 20 branches", StringComparison.Ordinal));
        Assert.Contains(reading.Warnings, warning => warning.Text.Contains("3 transformers", StringComparison.Ordinal));
    }

    private static PlanReading Import(string[] lines, CommonDataFormatOptions? options = null) =>
        CommonDataFormat.Read(Encoding.Latin1.GetBytes(string.Join('\n', lines)), options);
}
