using Halfvoice.Plans;
using Halfvoice.Tests.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>Scheme injection without noise ends in the central optimum.</summary>
public class InjectionOptimumTests
{
    [Theory]
    [InlineData("ieee-14")]
    [InlineData("ieee-118")]
    public void Published_networks_settle_at_the_optimum(string name) => Check(PlanFolders.Read(PlanFolders.Case(name)).Plan!, 1);

    [Fact]
    public void The_demo_settles_at_the_optimum_in_every_cycle() => Check(PlanFolders.Read(PlanFolders.Demo).Plan!, 3);

    [Theory]
    [InlineData(3, 1, 1)]
    [InlineData(5, 2, 4)]
    [InlineData(12, 3, 1)]
    [InlineData(10, 4, 3)]
    [InlineData(30, 5, 1)]
    [InlineData(25, 6, 2)]
    [InlineData(80, 7, 1)]
    public void Invented_plans_settle_at_the_optimum(int sites, int seed, int busesPerSite) =>
        Check(InventedPlans.Make(sites, seed, busesPerSite, 2), 2);

    private static void Check(Plan plan, int cycles) =>
        OptimumReached.Check(PlainRun.Tightened(plan with { Cycles = cycles }, SchemeKind.Injection, 1e-6, 1e-6, 20_000), 1e-4);
}
