using Halfvoice.Grid;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

public class PlanWriterTests
{
    [Fact]
    public void The_demo_and_the_sample_come_back_equal() => Assert.All(
        [PlanFolders.Demo, PlanFolders.Sample],
        folder => AssertComesBack(PlanFolders.Read(folder).Plan!));

    [Theory]
    [InlineData("ieee-14")]
    [InlineData("ieee-118-areas")]
    public void Published_networks_come_back_equal(string name) => AssertComesBack(PlanFolders.Read(PlanFolders.Case(name)).Plan!);

    [Fact]
    public void Awkward_names_numbers_and_settings_come_back_equal()
    {
        var network = new Network(
            99.9,
            [new Bus("a,\"b\"", "s-1", " spaced ", 0.1, -1e-7), new Bus("null", "yes"), new Bus("Zoë ☂", "yes", "x\ny")],
            [new Line("#1", 0, 1, 0.1 + 0.2, 1.0 / 3), new Line("l 2", 1, 2, -1e-5, double.PositiveInfinity, 0.01, 7)],
            [new Generator("g", 0, -1e6, 1e6, 1e-300, -12.3456789012345678, 0.1)]);
        AssertComesBack(new Plan
        {
            Name = "A \"plan\": with \\ and # and é",
            Interval = TimeSpan.FromMilliseconds(1500),
            Cycles = 7,
            Scheme = new SchemeSettings { Kind = SchemeKind.Angle, PenaltyFactor = 0.3, Relaxation = 1.05, PriceScalePerMwh = 1.0 / 7 },
            Stop = new StopSettings { MismatchFraction = 1.0 / 3, PriceMovePerMwh = 1e-9, RoundCap = 1, ReferenceLoadMw = 123.456 },
            Privacy = new PrivacySettings
            {
                Mechanism = MechanismKind.None,
                AdjacencyMw = 0.1,
                Epsilon = 0.7,
                Delta = 1e-6,
                Scope = PrivacyScope.Campaign,
                Stated = true,
            },
            Rounds = new RoundSettings { Deadline = TimeSpan.FromMilliseconds(1), Quorum = 0.123456789, HoldRounds = 0 },
            Links = new LinkPlan
            {
                Default = LinkProfiles.ByName["lte"] with { Jitter = TimeSpan.Zero },
                Sites = new Dictionary<string, LinkSettings>
                {
                    ["yes"] = new(null, TimeSpan.FromTicks(12345), TimeSpan.FromSeconds(59), 0.07, double.PositiveInfinity),
                    ["s-1"] = LinkProfiles.ByName["uhf-radio"],
                },
            },
            Accept = new AcceptSettings
            {
                SettleWithin = TimeSpan.FromHours(24),
                CostGapFraction = 0,
                ReserveMw = 0,
                LineLoadingFraction = 1.1,
                EpsilonPerDay = 0,
            },
            Network = network,
            Loads = new Dictionary<string, LoadSeries>
            {
                ["s-1"] = new([], [[-0.1]]),
                ["yes"] = new(["08:00", "08:05"], [[1, 2], [0.30000000000000004, 0]]),
            },
        });
    }

    [Fact]
    public void A_site_without_load_gets_no_file_and_a_comment_leads_the_plan()
    {
        var plan = new PlanTexts().Without("loads/north.csv").Read().Plan!;
        var files = PlanWriter.Write(plan, "First line\nsecond line");
        Assert.DoesNotContain("loads/north.csv", files.Keys);
        Assert.StartsWith("# First line\n# second line\nname: Small\n", files["plan.yaml"], StringComparison.Ordinal);
    }

    private static void AssertComesBack(Plan plan)
    {
        var reading = PlanReader.Read(new MemoryPlanFiles(PlanWriter.Write(plan)));
        Assert.Empty(reading.ErrorLines());
        PlanEquality.AssertEqual(plan, reading.Plan!);
    }
}
