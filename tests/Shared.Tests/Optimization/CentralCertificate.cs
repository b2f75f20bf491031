using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Tests.Optimization;

/// <summary>
/// Optimality conditions of the central problem, checked from the network's own records and the published numbers alone. A convex
/// problem whose conditions hold is solved: no second solver is needed to believe it.
/// </summary>
internal static class CentralCertificate
{
    /// <param name="mw">Tolerance of balance, limits and set-points, MW.</param>
    /// <param name="price">Tolerance of the price conditions, $/MWh.</param>
    public static void Holds(Network network, double[] loadMw, Optimum optimum, double mw = 1e-6, double price = 1e-5)
    {
        Assert.Equal(OptimumStatus.Optimal, optimum.Status);
        var rest = loadMw.Select(load => -load).ToArray();
        var pull = new double[loadMw.Length];
        var stiffness = new double[loadMw.Length];
        for (var l = 0; l < network.Lines.Count; l++)
        {
            var line = network.Lines[l];
            var b = network.SusceptanceMwPerRad(l);
            var flow = b * (optimum.AngleRad[line.FromBus] - optimum.AngleRad[line.ToBus]);
            Assert.Equal(flow, optimum.FlowMw[l], mw);
            Assert.True(Math.Abs(flow) <= line.LimitMw + mw, $"{line.Name} carries {flow} MW, limit {line.LimitMw}");
            rest[line.FromBus] -= flow;
            rest[line.ToBus] += flow;
            var rent = optimum.LinePricePerMwh[l];
            Assert.True(rent >= 0);
            Assert.True(rent <= price || Math.Abs(flow) >= line.LimitMw - (10 * mw), $"{line.Name} has a price of {rent} off its limit");

            // For a line at 0 MW the sign of the multiplier is not told by its flow: leave its two buses out.
            var open = line.LimitMw == 0 ? double.PositiveInfinity : 0;
            var y = rent <= price ? 0 : Math.Sign(flow) * rent;
            var term = b * (optimum.PricePerMwh[line.FromBus] - optimum.PricePerMwh[line.ToBus] + y);
            pull[line.FromBus] += term;
            pull[line.ToBus] -= term;
            stiffness[line.FromBus] += Math.Abs(b) + open;
            stiffness[line.ToBus] += Math.Abs(b) + open;
        }

        for (var g = 0; g < network.Generators.Count; g++)
        {
            var plant = network.Generators[g];
            var p = optimum.DispatchMw[g];
            Assert.InRange(p, plant.MinMw, plant.MaxMw);
            rest[plant.Bus] += p;
            var profit = optimum.PricePerMwh[plant.Bus] - plant.MarginalCost(p);
            Assert.True(profit <= price || p >= plant.MaxMw - (10 * mw), $"{plant.Name} would earn {profit} by giving more");
            Assert.True(profit >= -price || p <= plant.MinMw + (10 * mw), $"{plant.Name} would save {-profit} by giving less");
        }

        for (var i = 0; i < loadMw.Length; i++)
        {
            Assert.True(Math.Abs(rest[i]) <= mw, $"bus {i} is out of balance by {rest[i]} MW");
            Assert.True(Math.Abs(pull[i]) <= price * Math.Max(1, stiffness[i]), $"bus {i} violates the angle condition by {pull[i]}");
        }
    }
}
