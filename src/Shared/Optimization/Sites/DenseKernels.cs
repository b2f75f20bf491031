using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;

namespace Halfvoice.Optimization;

/// <summary>
/// Inner loops of the dense factor. They always work in groups of four, on every processor and under every compiler,
/// without fused operations, so that equal inputs give equal bits everywhere.
/// </summary>
internal static class DenseKernels
{
    /// <summary>Σ a_i b_i over the length of <paramref name="a"/>.</summary>
    public static double Dot(ReadOnlySpan<double> a, ReadOnlySpan<double> b)
    {
        b = b[..a.Length];
        var left = MemoryMarshal.Cast<double, Vector256<double>>(a);
        var right = MemoryMarshal.Cast<double, Vector256<double>>(b);
        var sums = Vector256<double>.Zero;
        for (var i = 0; i < left.Length; i++)
            sums += left[i] * right[i];
        var sum = sums[0] + sums[1] + (sums[2] + sums[3]);
        for (var i = left.Length * 4; i < a.Length; i++)
            sum += a[i] * b[i];
        return sum;
    }

    /// <summary>y += scale · x over the length of <paramref name="x"/>.</summary>
    public static void AddScaled(Span<double> y, double scale, ReadOnlySpan<double> x)
    {
        y = y[..x.Length];
        var target = MemoryMarshal.Cast<double, Vector256<double>>(y);
        var source = MemoryMarshal.Cast<double, Vector256<double>>(x);
        var factor = Vector256.Create(scale);
        for (var i = 0; i < source.Length; i++)
            target[i] += factor * source[i];
        for (var i = source.Length * 4; i < x.Length; i++)
            y[i] += scale * x[i];
    }

    /// <summary>Plane rotation of two rows: (a, b) becomes (c·a + s·b, c·b − s·a).</summary>
    public static void Rotate(Span<double> a, Span<double> b, double cosine, double sine)
    {
        b = b[..a.Length];
        var upper = MemoryMarshal.Cast<double, Vector256<double>>(a);
        var lower = MemoryMarshal.Cast<double, Vector256<double>>(b);
        var c = Vector256.Create(cosine);
        var s = Vector256.Create(sine);
        for (var i = 0; i < upper.Length; i++)
        {
            var old = upper[i];
            upper[i] = (c * old) + (s * lower[i]);
            lower[i] = (c * lower[i]) - (s * old);
        }

        for (var i = upper.Length * 4; i < a.Length; i++)
            (a[i], b[i]) = ((cosine * a[i]) + (sine * b[i]), (cosine * b[i]) - (sine * a[i]));
    }
}
