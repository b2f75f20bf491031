using Halfvoice.Grid;
using Halfvoice.Optimization;
using MathNet.Numerics.LinearAlgebra;

namespace Halfvoice.Tests.Optimization;

public class CentralProjectionTests
{
    private const double PriceScale = 50;

    /// <summary>A random network, penalties and free marks; limits loose enough that most wishes have a projection.</summary>
    private static (Network Network, double[] LoadMw, double[] Penalty, bool[] Free) Case(Random random)
    {
        var (network, load) = CentralNetworks.Random(random, quadratic: false);
        var penalty = load.Select(_ => 0.05 + (2 * random.NextDouble())).ToArray();
        var free = load.Select(_ => random.Next(3) != 0).ToArray();
        return (network, load, penalty, free);
    }

    private static double[] Wish(Random random, double[] load, bool[] free) =>
        load.Select((mw, i) => (free[i] ? 150 * (random.NextDouble() - 0.5) : 0) - (0.2 * mw)).ToArray();

    /// <summary>Flow sensitivities from dense algebra: H = diag(b) A B⁺.</summary>
    private static Matrix<double> Sensitivities(Network network)
    {
        var incidence = Matrix<double>.Build.Dense(network.Lines.Count, network.Buses.Count);
        var weighted = Matrix<double>.Build.Dense(network.Lines.Count, network.Buses.Count);
        for (var l = 0; l < network.Lines.Count; l++)
        {
            var line = network.Lines[l];
            incidence[l, line.FromBus] = 1;
            incidence[l, line.ToBus] = -1;
            weighted[l, line.FromBus] = 1 / line.ReactancePu;
            weighted[l, line.ToBus] = -1 / line.ReactancePu;
        }

        var susceptance = incidence.TransposeThisAndMultiply(weighted);
        foreach (var island in Islands(network))
        {
            // Adding the all-ones matrix on an island makes B invertible and leaves flows of balanced injections alone.
            foreach (var a in island)
            {
                foreach (var b in island)
                    susceptance[a, b] += 10;
            }
        }

        return weighted * susceptance.Inverse();
    }

    private static List<int[]> Islands(Network network)
    {
        var seen = new bool[network.Buses.Count];
        var islands = new List<int[]>();
        for (var first = 0; first < seen.Length; first++)
        {
            if (seen[first])
                continue;
            var island = new List<int> { first };
            seen[first] = true;
            for (var k = 0; k < island.Count; k++)
            {
                foreach (var l in network.LinesAt(island[k]))
                {
                    var other = network.Lines[l].FromBus + network.Lines[l].ToBus - island[k];
                    if (!seen[other])
                        island.Add(other);
                    seen[other] = true;
                }
            }

            islands.Add([.. island]);
        }

        return islands;
    }

    /// <summary>Feasibility, complementarity, and ρ(z − wish) + Hᵀy equal over the free buses of an island.</summary>
    private static void CertificateHolds(
        Network network, double[] penalty, bool[] free, double[] wish, double[] z, ReadOnlySpan<double> linePrice, string what)
    {
        var size = Math.Max(1, wish.Max(Math.Abs));
        var sensitivities = Sensitivities(network);
        var flow = sensitivities * Vector<double>.Build.Dense(z);
        var multiplier = new double[network.Lines.Count];
        var flowSize = Math.Max(size, flow.AbsoluteMaximum());
        for (var l = 0; l < multiplier.Length; l++)
        {
            var limit = network.Lines[l].LimitMw;
            Assert.True(Math.Abs(flow[l]) <= limit + (1e-9 * flowSize), $"{what}: line {l} carries {flow[l]}, limit {limit}");
            Assert.True(linePrice[l] >= 0);
            Assert.True(linePrice[l] == 0 || Math.Abs(flow[l]) >= limit - (1e-9 * flowSize), $"{what}: line {l} has a price off its limit");
            multiplier[l] = Math.Sign(flow[l]) * linePrice[l];
        }

        var pull = sensitivities.TransposeThisAndMultiply(Vector<double>.Build.Dense(multiplier));
        foreach (var island in Islands(network))
        {
            Assert.True(Math.Abs(island.Sum(i => z[i])) <= 1e-9 * size, $"{what}: an island is out of balance");
            var marginal = island.Where(i => free[i]).Select(i => (penalty[i] * (z[i] - wish[i])) + pull[i]).ToArray();
            if (marginal.Length > 0)
            {
                var scale = Math.Max(PriceScale, Math.Max(linePrice.ToArray().Max(), marginal.Max(Math.Abs)));
                Assert.True(marginal.Max() - marginal.Min() <= 1e-8 * scale, $"{what}: prices differ by {marginal.Max() - marginal.Min()}");
            }
        }

        for (var i = 0; i < z.Length; i++)
            Assert.True(free[i] || z[i] == wish[i], $"{what}: bus {i} was moved");
    }

    /// <summary>500 networks, five wishes each through one projection, so that every call but the first starts warm.</summary>
    [Fact]
    public void Projections_meet_the_optimality_conditions_and_forget_where_they_started()
    {
        int binding = 0, relaxed = 0;
        for (var seed = 0; seed < 500; seed++)
        {
            var random = new Random(seed);
            var (network, load, penalty, free) = Case(random);
            var warm = new NetworkProjection(network, penalty, free, PriceScale);
            var z = new double[load.Length];
            var again = new double[load.Length];
            for (var call = 0; call < 5; call++)
            {
                var wish = Wish(random, load, free);
                var outcome = warm.Project(wish, z);
                Assert.True(outcome.Converged, $"seed {seed}, call {call}");
                if (outcome.Relaxed)
                {
                    relaxed++;
                    continue;
                }

                binding += outcome.ActiveLines;
                // A line held at 0 MW hides the sign of its multiplier, so its price cannot be checked from outside.
                if (network.Lines.All(line => line.LimitMw > 0))
                    CertificateHolds(network, penalty, free, wish, z, warm.LinePricePerMwh, $"seed {seed}, call {call}");
                var cold = new NetworkProjection(network, penalty, free, PriceScale).Project(wish, again);
                Assert.False(cold.Relaxed);
                var size = Math.Max(1, wish.Max(Math.Abs));
                for (var i = 0; i < z.Length; i++)
                    Assert.True(Math.Abs(z[i] - again[i]) <= 1e-9 * size, $"seed {seed}, call {call}, bus {i}: {z[i]}, cold {again[i]}");
            }
        }

        Assert.True(binding >= 500 && relaxed is >= 50 and <= 1500, $"{binding} lines held, {relaxed} relaxed");
    }

    [Fact]
    public void Projections_agree_with_the_interior_point_method()
    {
        for (var seed = 2000; seed < 2500; seed++)
        {
            var random = new Random(seed);
            var (network, load, penalty, free) = Case(random);
            var wish = Wish(random, load, free);
            var z = new double[load.Length];
            var outcome = new NetworkProjection(network, penalty, free, PriceScale).Project(wish, z);
            var moves = Enumerable.Range(0, load.Length).Where(i => free[i])
                .Select(i => new Block(i, double.NegativeInfinity, double.PositiveInfinity, 0, penalty[i])).ToArray();
            var demand = wish.Select(mw => -mw).ToArray();
            var other = outcome.Relaxed
                ? new NetworkProgram(network).SolveElastic(moves, demand, 10 * PriceScale)
                : new NetworkProgram(network).Solve(moves, demand);
            Assert.True(other.Converged, $"seed {seed}, relaxed {outcome.Relaxed}");
            if (outcome.Relaxed)
            {
                Assert.Equal(other.ShedMw.Sum() + other.SpillMw.Sum(), outcome.UnservedMw, 1e-6);
                continue;
            }

            for (var k = 0; k < moves.Length; k++)
            {
                var moved = wish[moves[k].Bus] + other.BlockMw[k];
                Assert.True(Math.Abs(moved - z[moves[k].Bus]) <= 1e-5, $"seed {seed}, bus {moves[k].Bus}: {z[moves[k].Bus]}, {moved}");
            }
        }
    }

    [Fact]
    public void A_warm_projection_allocates_nothing()
    {
        var random = new Random(5);
        Bus[] buses = [.. Enumerable.Range(0, 30).Select(i => new Bus($"B{i}", $"S{i}"))];
        Line[] lines = [.. Enumerable.Range(0, 30).Select(i => new Line($"L{i}", i, (i + 1) % 30, 0.1, 40)),
            .. Enumerable.Range(0, 15).Select(i => new Line($"M{i}", i, i + 15, 0.1, 40))];
        var penalty = Enumerable.Repeat(1.0, 30).ToArray();
        var free = Enumerable.Repeat(true, 30).ToArray();
        var projection = new NetworkProjection(new Network(100, buses, lines, []), penalty, free, PriceScale);
        var wishes = Enumerable.Range(0, 20).Select(_ => buses.Select(_ => 300 * (random.NextDouble() - 0.5)).ToArray()).ToArray();
        var z = new double[30];
        var held = wishes.Sum(wish => projection.Project(wish, z).ActiveLines);
        Assert.True(held > 20);
        var before = GC.GetAllocatedBytesForCurrentThread();
        foreach (var wish in wishes)
            projection.Project(wish, z);
        Assert.Equal(0, GC.GetAllocatedBytesForCurrentThread() - before);
    }

    [Fact]
    public void Fixed_injections_that_overload_a_line_are_relaxed_by_the_least_power()
    {
        Bus[] buses = [new("A", "A"), new("B", "B"), new("C", "C")];
        Line[] lines = [new("A-B", 0, 1, 0.1, 30), new("B-C", 1, 2, 0.1, 100)];
        var projection = new NetworkProjection(new Network(100, buses, lines, []), [1, 1, 1], [true, false, true], PriceScale);
        var z = new double[3];
        var outcome = projection.Project([50, -60, 10], z);
        Assert.False(outcome.Relaxed);
        double[] expected = [30, -60, 30];
        for (var i = 0; i < 3; i++)
            Assert.Equal(expected[i], z[i], 1e-9);

        // With A fixed as well, 20 MW have to stay at A and to be left out at B.
        var stuck = new NetworkProjection(new Network(100, buses, lines, []), [1, 1, 1], [false, false, true], PriceScale);
        outcome = stuck.Project([50, -60, 10], z);
        Assert.True(outcome.Relaxed && outcome.Converged);
        Assert.Equal(20, outcome.UnservedMw, 1e-6);
        Assert.Equal(30, z[0], 1e-6);
        Assert.Equal(0, z.Sum(), 1e-6);
    }

    [Fact]
    public void An_island_with_nothing_free_is_relaxed_when_out_of_balance()
    {
        Bus[] buses = [new("A", "A"), new("B", "B"), new("C", "C")];
        Line[] lines = [new("A-B", 0, 1, 0.1)];
        var projection = new NetworkProjection(new Network(100, buses, lines, []), [1, 1, 1], [true, true, false], PriceScale);
        var z = new double[3];
        var outcome = projection.Project([5, 3, -2], z);
        Assert.True(outcome.Relaxed);
        Assert.Equal(2, outcome.UnservedMw, 1e-6);
        Assert.Equal(0, z[2], 1e-6);
        Assert.Equal(1, z[0], 1e-6);
        outcome = projection.Project([5, 3, 0], z);
        Assert.False(outcome.Relaxed);
        Assert.Equal([1, -1, 0], z);
    }

    [Fact]
    public void Wrong_input_is_refused()
    {
        var network = new Network(100, [new("A", "A"), new("B", "B")], [new("A-B", 0, 1, 0.1)], []);
        Assert.Throws<ArgumentException>(() => new NetworkProjection(network, [1], [true], PriceScale));
        Assert.Throws<ArgumentException>(() => new NetworkProjection(network, [1, 0], [true, true], PriceScale));
        Assert.Throws<ArgumentOutOfRangeException>(() => new NetworkProjection(network, [1, 1], [true, true], 0));
        var projection = new NetworkProjection(network, [1, 0], [true, false], PriceScale);
        Assert.Throws<ArgumentException>(() => projection.Project([1, double.NaN], new double[2]));
        Assert.Throws<ArgumentException>(() => projection.Project([1], new double[2]));
    }

    /// <summary>Two cases in which a susceptance matrix loses a pivot: a lone series capacitor, and one that cancels its line.</summary>
    [Fact]
    public void Series_capacitors_are_projected_exactly()
    {
        Bus[] buses = [new("A", "A"), new("B", "B"), new("C", "C"), new("D", "D")];
        Line[] lone = [new("capacitor", 0, 1, -0.03, 20), new("other", 2, 3, 0.1)];
        Line[] cancelling =
            [new("a", 0, 1, 0.1, 20), new("capacitor", 1, 2, -0.1), new("b", 2, 3, 0.05, 30), new("c", 0, 3, 0.3)];
        foreach (var lines in (Line[][])[lone, cancelling])
        {
            var network = new Network(100, buses, lines, []);
            double[] penalty = [1, 0.5, 2, 1], wish = [60, -25, -50, 5];
            bool[] free = [true, true, true, true];
            var projection = new NetworkProjection(network, penalty, free, PriceScale);
            var z = new double[4];
            var outcome = projection.Project(wish, z);
            Assert.False(outcome.Relaxed);
            Assert.True(outcome.ActiveLines > 0);
            CertificateHolds(network, penalty, free, wish, z, projection.LinePricePerMwh, lines[0].Name);
        }
    }
}
