using Halfvoice.Grid;
using Halfvoice.Optimization;
using MathNet.Numerics.LinearAlgebra;

namespace Halfvoice.Tests.Optimization;

public class PowerFlowTests
{
    [Fact]
    public void Flows_and_sensitivities_of_random_networks_are_those_of_a_dense_solution()
    {
        for (var seed = 0; seed < 300; seed++)
        {
            var random = new Random(seed);
            var (network, injection) = CentralNetworks.Random(random, quadratic: false);
            var flow = new PowerFlow(network);
            var dense = DenseSensitivity(network);
            var scale = dense.Enumerate().Max(Math.Abs);
            AssertClose((dense * Vector<double>.Build.Dense(injection)).ToArray(), flow.FlowMw(injection), 1e-7 * scale * 100, seed);
            for (var l = 0; l < network.Lines.Count; l++)
                AssertClose(dense.Row(l).ToArray(), flow.Sensitivity(l), 1e-7 * scale, seed);
        }
    }

    [Fact]
    public void A_solve_leaves_nothing_behind_for_the_next()
    {
        var (network, injection) = CentralNetworks.Random(new Random(5), quadratic: false);
        var flow = new PowerFlow(network);
        var first = flow.FlowMw(injection);
        flow.Sensitivity(0);
        Assert.Equal(first, flow.FlowMw(injection));
    }

    /// <summary>diag(b) A (Aᵀ diag(b) A)⁻¹ by dense LU, an injection being taken out at the first bus of its island.</summary>
    private static Matrix<double> DenseSensitivity(Network network)
    {
        var (buses, lines) = (network.Buses.Count, network.Lines.Count);
        var ends = Matrix<double>.Build.Dense(lines, buses);
        for (var l = 0; l < lines; l++)
        {
            ends[l, network.Lines[l].FromBus] += 1;
            ends[l, network.Lines[l].ToBus] -= 1;
        }

        var weighted = Matrix<double>.Build.DenseOfDiagonalArray([.. Enumerable.Range(0, lines).Select(network.SusceptanceMwPerRad)]) * ends;
        var matrix = ends.TransposeThisAndMultiply(weighted);
        var balanced = Matrix<double>.Build.DenseIdentity(buses);
        foreach (var island in Islands.Of(network))
        {
            var reference = island.Min();
            foreach (var bus in island)
            {
                matrix[reference, bus] = bus == reference ? 1 : 0;
                balanced[reference, bus] = 0;
            }
        }

        return weighted * matrix.LU().Solve(balanced);
    }

    private static void AssertClose(double[] expected, double[] actual, double tolerance, int seed)
    {
        Assert.Equal(expected.Length, actual.Length);
        for (var i = 0; i < expected.Length; i++)
            Assert.True(Math.Abs(expected[i] - actual[i]) <= tolerance, FormattableString.Invariant($"Seed {seed}: {expected[i]} against {actual[i]}."));
    }
}
