using Halfvoice.Privacy;
using MathNet.Numerics.Distributions;

namespace Halfvoice.Tests.Privacy;

/// <summary>Independent figures of the discrete Laplace distribution and the χ² test against them.</summary>
internal static class NoiseStatistics
{
    /// <summary>P(Z ≥ m), summed up from the definition P(z) ∝ a^|z|: a^m/(1 − a) over (1 + a)/(1 − a).</summary>
    internal static double AtLeast(long m, double scale)
    {
        if (m <= 0)
            return 1 - AtLeast(1 - m, scale);
        var a = Math.Exp(-1 / scale);
        return Math.Exp(-m / scale) / (1 + a);
    }

    /// <summary>
    /// p-value of χ² over the cells between the edges: cell i holds edges[i − 1] ≤ z &lt; edges[i], the outer ones are open.
    /// </summary>
    internal static double PValue(IReadOnlyCollection<long> draws, long[] edges, double scale)
    {
        var counts = new long[edges.Length + 1];
        foreach (var z in draws)
        {
            var at = Array.BinarySearch(edges, z);
            counts[at >= 0 ? at + 1 : ~at]++;
        }

        var chi = 0.0;
        for (var i = 0; i <= edges.Length; i++)
        {
            var from = i == 0 ? 1 : AtLeast(edges[i - 1], scale);
            var to = i == edges.Length ? 0 : AtLeast(edges[i], scale);
            var expected = (from - to) * draws.Count;
            Assert.True(expected >= 5, "Cells of a χ² test expect at least 5 draws.");
            chi += (counts[i] - expected) * (counts[i] - expected) / expected;
        }

        return 1 - ChiSquared.CDF(edges.Length, chi);
    }

    /// <summary>Every value within 4 scales as a cell of its own for small scales, 33 cells for large ones.</summary>
    internal static long[] Edges(long scale)
    {
        var edges = new SortedSet<long>();
        for (var i = -16; i <= 16; i++)
            edges.Add((long)Math.Round(i * scale / 4.0));
        if (scale <= 8)
        {
            for (var z = -4 * scale; z <= 4 * scale + 1; z++)
                edges.Add(z);
        }

        return [.. edges];
    }

    internal static long[] Draw(int count, long scale, ulong seed)
    {
        using var noise = new NoiseReader(new SeededNoiseSource(seed));
        var draws = new long[count];
        for (var i = 0; i < count; i++)
            draws[i] = DiscreteLaplace.Draw(noise, scale);
        return draws;
    }
}
