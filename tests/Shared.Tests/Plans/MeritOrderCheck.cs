using Halfvoice.Grid;
using MathNet.Numerics.LinearAlgebra;

namespace Halfvoice.Tests.Plans;

/// <summary>The cheapest dispatch without limits and its flows, found in other ways than the product's.</summary>
internal static class MeritOrderCheck
{
    /// <summary>Fills the load piece by piece in order of marginal cost, each plant cut into 2,000 pieces.</summary>
    public static double[] Dispatch(IReadOnlyList<Generator> plants, double loadMw)
    {
        const int pieces = 2000;
        var output = plants.Select(plant => plant.MinMw).ToArray();
        var rest = loadMw - output.Sum();
        var offers = plants
            .SelectMany((plant, g) => Enumerable.Range(0, plant.RangeMw > 0 ? pieces : 0).Select(piece =>
                (Price: plant.MarginalCost(plant.MinMw + (plant.RangeMw * (piece + 0.5) / pieces)), Plant: g, Mw: plant.RangeMw / pieces)))
            .OrderBy(offer => offer.Price);
        foreach (var offer in offers)
        {
            if (rest <= 0)
                break;
            output[offer.Plant] += Math.Min(rest, offer.Mw);
            rest -= offer.Mw;
        }

        Assert.True(rest <= 1e-6);
        return output;
    }

    public static double[] DenseFlows(Network network, double[] injectionMw)
    {
        var n = network.Buses.Count;
        var matrix = Matrix<double>.Build.Dense(n - 1, n - 1);
        for (var l = 0; l < network.Lines.Count; l++)
        {
            var (from, to, b) = (network.Lines[l].FromBus - 1, network.Lines[l].ToBus - 1, network.SusceptanceMwPerRad(l));
            if (from >= 0)
                matrix[from, from] += b;
            if (to >= 0)
                matrix[to, to] += b;
            if (from < 0 || to < 0)
                continue;
            matrix[from, to] -= b;
            matrix[to, from] -= b;
        }

        var angle = matrix.Cholesky().Solve(Vector<double>.Build.Dense(injectionMw[1..]));
        return [.. network.Lines.Select((line, l) => network.SusceptanceMwPerRad(l) * (At(line.FromBus) - At(line.ToBus)))];

        double At(int bus) => bus == 0 ? 0 : angle[bus - 1];
    }
}
