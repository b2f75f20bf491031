using System.Globalization;
using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>Runs a plan without noise and compares what it settles at with the central optimum.</summary>
internal static class OptimumReached
{
    private const double CostTolerance = 1e-4;

    /// <summary>Cost within 0.01 %, set-points that every optimum shares within the tolerance, and at least half of all set-points such.</summary>
    public static void Check(Plan plan, double toleranceMw)
    {
        var run = PlainRun.Of(plan);
        Assert.Equal(plan.Cycles, run.Cycles.Count);
        foreach (var cycle in run.Cycles)
        {
            Assert.Equal(CycleEnd.Settled, cycle.End);
            Assert.Equal(0, cycle.UnservedMw);
            var optimum = run.Optimum(cycle.Cycle);
            var gap = (run.CostPerHour(cycle.Cycle) / optimum.CostPerHour) - 1;
            var unique = OptimumUniqueness.Of(plan.Network, optimum);
            var setPoints = run.SetPointsMw(cycle.Cycle);
            var worst = Enumerable.Range(0, unique.Length).Where(g => unique[g])
                .Max(g => Math.Abs(setPoints[g] - optimum.DispatchMw[g]));
            var shared = unique.Count(u => u);
            TestContext.Current.TestOutputHelper?.WriteLine(string.Create(CultureInfo.InvariantCulture,
                $"cycle {cycle.Cycle}: {cycle.Rounds} rounds, gap {gap:E2}, {shared} of {unique.Length} unique, worst {worst:E2} MW"));
            Assert.InRange(gap, -CostTolerance, CostTolerance);
            Assert.InRange(worst, 0, toleranceMw);
            Assert.True(2 * shared >= unique.Length, $"Only {shared} of {unique.Length} set-points are unique: the plan shows too little.");
        }
    }
}
