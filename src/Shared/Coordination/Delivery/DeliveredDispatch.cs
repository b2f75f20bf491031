using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Coordination;

/// <summary>
/// What the plants really do after a cycle, with true loads: they run at their set-points; the imbalance that is left is
/// shared by the published participation rule, each generator in proportion to its headroom in the direction needed (that
/// is the reserve used); true flows follow. A rehearsal can know this, the coordinator never does.
/// </summary>
public static class DeliveredDispatch
{
    /// <summary>A cost gap below this is a solver's rounding, as a fraction.</summary>
    public const double GapTolerance = 1e-6;

    // A flow this far over its limit (MW) still counts as at the limit: interior-point and rounding error.
    private const double LineToleranceMw = 1e-4;

    private const double LeastLimitMw = 1e-3;

    /// <param name="network">The whole network.</param>
    /// <param name="loadMw">True loads by bus, MW.</param>
    /// <param name="setPointMw">Set-points by generator, MW.</param>
    /// <param name="optimumPerHour">Cost of the central optimum for these loads, $/h.</param>
    /// <exception cref="ArgumentException">An array has the wrong length.</exception>
    public static DeliveredScore Score(Network network, double[] loadMw, double[] setPointMw, double optimumPerHour)
    {
        if (loadMw.Length != network.Buses.Count || setPointMw.Length != network.Generators.Count)
            throw new ArgumentException("Loads go by bus and set-points by generator.");
        var output = (double[])setPointMw.Clone();
        var flow = new PowerFlow(network);
        double reserve = 0, unbalanced = 0;
        foreach (var island in flow.Islands)
        {
            var imbalance = Imbalance(network, island, loadMw, output);
            var used = Balance(network, island, output, imbalance);
            reserve += Math.Abs(used);
            unbalanced += Math.Abs(imbalance - used);
        }

        var injection = new double[loadMw.Length];
        for (var b = 0; b < injection.Length; b++)
            injection[b] = -loadMw[b] + network.GeneratorsAt(b).Sum(g => output[g]);
        var flows = flow.FlowMw(injection);
        var overloads = Overloads(network, flows);
        var cost = network.Generators.Select((g, i) => g.CostPerHour(output[i])).Sum();
        var worst = Worst(network, flows);
        return new DeliveredScore
        {
            OutputMw = output,
            FlowMw = flows,
            CostPerHour = cost,
            CostGap = CostGap(network, loadMw, flows, overloads, cost, optimumPerHour),
            ReserveMw = reserve,
            UnbalancedMw = unbalanced,
            WorstLoading = worst.Loading,
            WorstLine = worst.Line,
            Overloads = overloads,
        };
    }

    private static double Imbalance(Network network, IReadOnlyList<int> island, double[] loadMw, double[] output) =>
        island.Sum(b => network.GeneratorsAt(b).Sum(g => output[g]) - loadMw[b]);

    /// <summary>Takes the imbalance off the generators by headroom; returns what they could take, MW (signed).</summary>
    private static double Balance(Network network, IReadOnlyList<int> island, double[] output, double imbalance)
    {
        var generators = island.SelectMany(network.GeneratorsAt).ToArray();
        var headroom = Array.ConvertAll(generators, g => Math.Max(0, imbalance > 0
            ? output[g] - network.Generators[g].MinMw
            : network.Generators[g].MaxMw - output[g]));
        var room = headroom.Sum();
        if (room <= 0)
            return 0;
        var used = Math.CopySign(Math.Min(Math.Abs(imbalance), room), imbalance);
        for (var i = 0; i < generators.Length; i++)
            output[generators[i]] -= used * headroom[i] / room;
        return used;
    }

    private static (double Loading, int? Line) Worst(Network network, double[] flows)
    {
        (double Loading, int? Line) worst = (0, null);
        for (var l = 0; l < flows.Length; l++)
        {
            var limit = network.Lines[l].LimitMw;
            if (!double.IsFinite(limit))
                continue;

            // A limit of 0 counts as 1 kW, so that loadings stay finite.
            var loading = Math.Abs(flows[l]) / Math.Max(limit, LeastLimitMw);
            if (worst.Line is null || loading > worst.Loading)
                worst = (loading, l);
        }

        return worst;
    }

    private static Overload[] Overloads(Network network, double[] flows) => network.Lines
        .Select((line, i) => new Overload(i, Math.Abs(flows[i]), line.LimitMw))
        .Where(over => over.FlowMw > over.LimitMw + LineToleranceMw)
        .OrderByDescending(over => over.FlowMw / over.LimitMw)
        .ToArray();

    /// <summary>
    /// Delivered cost over the optimum, less 1. A dispatch that overloads lines could undercut the optimum, which may not:
    /// it is then measured against the optimum of a network whose overloaded lines carry what was delivered, so that the gap
    /// is never negative; the overload itself is reported beside it.
    /// </summary>
    private static double CostGap(Network network, double[] loadMw, double[] flows, Overload[] overloads, double cost, double optimumPerHour)
    {
        var yardstick = optimumPerHour;
        if (overloads.Length > 0)
        {
            var over = overloads.Select(o => o.Line).ToHashSet();
            var lines = network.Lines.Select((l, i) => over.Contains(i) ? l with { LimitMw = Math.Abs(flows[i]) + LineToleranceMw } : l).ToArray();
            var wider = CentralOptimum.Solve(new Network(network.BaseMva, network.Buses, lines, network.Generators), loadMw);
            if (wider.Status == OptimumStatus.Optimal)
                yardstick = Math.Min(yardstick, wider.CostPerHour);
        }

        // A region that costs nothing, or is paid to run, has no meaningful ratio: the scale is then 1 $/h.
        var gap = (cost - yardstick) / Math.Max(Math.Abs(yardstick), 1);
        return Math.Abs(gap) < GapTolerance ? Math.Max(gap, 0) : gap;
    }
}
