using Halfvoice.Plans;
using Halfvoice.Tests.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>Scheme angle without noise ends in the central optimum.</summary>
public class AngleOptimumTests
{
    [Fact]
    public void Fourteen_sites_of_one_bus_settle_at_the_optimum() =>
        Check(PlanFolders.Read(PlanFolders.Case("ieee-14")).Plan!, 1e-3, 1e-4, 0.01);

    [Fact]
    public void Eight_areas_of_the_118_bus_network_settle_at_the_optimum() =>
        Check(PlanFolders.Read(PlanFolders.Case("ieee-118-areas")).Plan!, 1e-2, 1e-4, 0.05);

    [Fact]
    public void Three_Fords_settles_at_the_optimum_in_both_cycles() =>
        Check(PlanFolders.Read(PlanFolders.Sample).Plan! with { Cycles = 2 }, 1e-3, 1e-4, 0.01);

    [Fact]
    public void An_invented_plan_with_sites_of_several_buses_settles_at_the_optimum() =>
        Check(InventedPlans.Make(6, 11, 3, 1) with { Cycles = 1 }, 1e-3, 1e-4, 0.01);

    private static void Check(Plan plan, double mismatchMw, double pricePerMwh, double toleranceMw) =>
        OptimumReached.Check(PlainRun.Tightened(plan, SchemeKind.Angle, mismatchMw, pricePerMwh, 60_000), toleranceMw);
}
