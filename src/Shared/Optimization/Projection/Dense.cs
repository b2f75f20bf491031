using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;

namespace Halfvoice.Optimization;

/// <summary>Dense vector kernels; their fixed order of summation gives equal bits whatever the machine's vector width.</summary>
internal static class Dense
{
    public static double Dot(ReadOnlySpan<double> a, ReadOnlySpan<double> b)
    {
        if (b.Length < a.Length)
            throw new ArgumentException("The second vector is shorter than the first.", nameof(b));
        ref var first = ref MemoryMarshal.GetReference(a);
        ref var second = ref MemoryMarshal.GetReference(b);
        var left = Vector256<double>.Zero;
        var right = Vector256<double>.Zero;
        var i = 0;
        for (; i <= a.Length - 8; i += 8)
        {
            left += Vector256.LoadUnsafe(ref first, (nuint)i) * Vector256.LoadUnsafe(ref second, (nuint)i);
            right += Vector256.LoadUnsafe(ref first, (nuint)i + 4) * Vector256.LoadUnsafe(ref second, (nuint)i + 4);
        }

        left += right;
        var sum = (left[0] + left[1]) + (left[2] + left[3]);
        for (; i < a.Length; i++)
            sum += a[i] * b[i];
        return sum;
    }

    /// <summary>target += factor · a.</summary>
    public static void Add(double factor, ReadOnlySpan<double> a, Span<double> target)
    {
        if (target.Length < a.Length)
            throw new ArgumentException("The target is shorter than what is added.", nameof(target));
        ref var source = ref MemoryMarshal.GetReference(a);
        ref var sink = ref MemoryMarshal.GetReference(target);
        var wide = Vector256.Create(factor);
        var i = 0;
        for (; i <= a.Length - 4; i += 4)
        {
            (Vector256.LoadUnsafe(ref sink, (nuint)i) + (wide * Vector256.LoadUnsafe(ref source, (nuint)i)))
                .StoreUnsafe(ref sink, (nuint)i);
        }

        for (; i < a.Length; i++)
            target[i] += factor * a[i];
    }
}
