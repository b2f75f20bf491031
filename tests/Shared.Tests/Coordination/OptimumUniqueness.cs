using Halfvoice.Grid;
using Halfvoice.Optimization;
using MathNet.Numerics.LinearAlgebra;

namespace Halfvoice.Tests.Coordination;

/// <summary>
/// Which set-points every optimal dispatch shares. A plant with a quadratic cost has one optimal output, and so has a plant
/// whose linear cost differs from its price. The plants left over, whose linear cost is the price, may only move along
/// directions that keep the total and the flow of every line with a price: Σ δ = 0 and h·δ = 0. A plant is unique when every
/// such direction leaves it alone. (Limits may pin it down further; such a plant is left out, which makes the test no weaker
/// for the others.)
/// </summary>
internal static class OptimumUniqueness
{
    private const double PriceTolerance = 1e-4;

    public static bool[] Of(Network network, Optimum optimum)
    {
        var unique = new bool[network.Generators.Count];
        var open = new List<int>();
        for (var g = 0; g < unique.Length; g++)
        {
            var plant = network.Generators[g];
            unique[g] = plant.RangeMw == 0 || plant.CostQuadratic > 0
                || Math.Abs(optimum.PricePerMwh[plant.Bus] - plant.CostLinear) > PriceTolerance;
            if (!unique[g])
                open.Add(g);
        }

        if (open.Count == 0)
            return unique;
        var priced = Enumerable.Range(0, network.Lines.Count).Where(l => optimum.LinePricePerMwh[l] > PriceTolerance).ToArray();
        var rows = Matrix<double>.Build.Dense(Math.Max(open.Count, priced.Length + 1), open.Count);
        var flow = new PowerFlow(network);
        for (var i = 0; i < open.Count; i++)
        {
            var injection = new double[network.Buses.Count];
            injection[network.Generators[open[i]].Bus] = 1;
            var share = flow.FlowMw(injection);
            rows[0, i] = 1;
            for (var r = 0; r < priced.Length; r++)
                rows[r + 1, i] = share[priced[r]];
        }

        var svd = rows.Svd();
        for (var i = 0; i < open.Count; i++)
        {
            var free = 0.0;
            for (var v = 0; v < open.Count; v++)
            {
                if (svd.S[v] < 1e-7)
                    free = Math.Max(free, Math.Abs(svd.VT[v, i]));
            }

            unique[open[i]] = free < 1e-6;
        }

        return unique;
    }
}
