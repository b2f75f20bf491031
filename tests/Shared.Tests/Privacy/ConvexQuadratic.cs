namespace Halfvoice.Tests.Privacy;

/// <summary>
/// A plain dense predictor-corrector interior-point solver for min ½·xᵀHx + cᵀx, E·x = f, G·x ≤ h (Mehrotra 1992, from
/// memory). Small problems only: it is the independent answer that sensitivity bounds are searched with.
/// </summary>
internal sealed class ConvexQuadratic(
    double[,] hessian, double[] cost, double[,] equal, double[] equalTo, double[,] less, double[] lessThan)
{
    private readonly int _n = cost.Length;
    private readonly int _e = equalTo.Length;
    private readonly int _m = lessThan.Length;

    /// <summary>How far the returned point is from optimal: the largest of gap and residuals, each against its own scale.</summary>
    internal double Error { get; private set; } = double.PositiveInfinity;

    internal double[] Solve()
    {
        var best = new double[_n];
        var scale = 1 + Largest(cost);
        var x = new double[_n];
        var y = new double[_e];
        var s = Enumerable.Repeat(10.0, _m).ToArray();
        var z = Enumerable.Repeat(10.0, _m).ToArray();
        for (var iteration = 0; iteration < 80; iteration++)
        {
            var dual = Add(Add(Add(Times(hessian, x), cost), Transposed(equal, y)), Transposed(less, z));
            var primal = Add(Times(equal, x), equalTo, -1);
            var slack = Add(Add(Times(less, x), s), lessThan, -1);
            var gap = s.Zip(z, (a, b) => a * b).Sum() / _m;
            var error = Math.Max(Math.Max(gap, Largest(dual)) / scale, Math.Max(Largest(primal), Largest(slack)));
            if (!double.IsFinite(error))
                return best;
            if (error < Error)
                (Error, best) = (error, x);
            if (error < 1e-14)
                return best;
            var kkt = Factored(s, z);
            var plain = s.Zip(z, (a, b) => a * b).ToArray();
            var (dx, dy, ds, dz) = Step(kkt, s, z, dual, primal, slack, plain);
            var reach = Math.Min(Reach(s, ds), Reach(z, dz));
            var aimed = s.Select((a, i) => (a + reach * ds[i]) * (z[i] + reach * dz[i])).Sum() / _m;
            var target = Math.Pow(aimed / gap, 3) * gap;
            var corrected = plain.Select((a, i) => a + ds[i] * dz[i] - target).ToArray();
            (dx, dy, ds, dz) = Step(kkt, s, z, dual, primal, slack, corrected);
            reach = 0.995 * Math.Min(Reach(s, ds), Reach(z, dz));
            x = Add(x, dx, reach);
            y = Add(y, dy, reach);
            s = Add(s, ds, reach);
            z = Add(z, dz, reach);
        }

        return best;
    }

    private (double[], double[], double[], double[]) Step(
        (double[,] Matrix, int[] Order) kkt, double[] s, double[] z, double[] dual, double[] primal, double[] slack, double[] product)
    {
        // ds = −slack − G·dx and z·ds + s·dz = −product, so dz = (z·(slack + G·dx) − product)/s.
        var fixedPart = slack.Select((r, i) => (z[i] * r - product[i]) / s[i]).ToArray();
        var right = new double[_n + _e];
        var top = Add(dual, Transposed(less, fixedPart));
        for (var i = 0; i < _n; i++)
            right[i] = -top[i];
        for (var i = 0; i < _e; i++)
            right[_n + i] = -primal[i];
        var solved = Back(kkt, right);
        var dx = solved[.._n];
        var moved = Times(less, dx);
        var ds = slack.Select((r, i) => -r - moved[i]).ToArray();
        var dz = fixedPart.Select((r, i) => r + z[i] * moved[i] / s[i]).ToArray();
        return (dx, solved[_n..], ds, dz);
    }

    private (double[,], int[]) Factored(double[] s, double[] z)
    {
        var size = _n + _e;
        var a = new double[size, size];
        for (var i = 0; i < _n; i++)
        {
            for (var j = 0; j < _n; j++)
                a[i, j] = hessian[i, j];
        }

        for (var k = 0; k < _m; k++)
        {
            for (var i = 0; i < _n; i++)
            {
                for (var j = 0; less[k, i] != 0 && j < _n; j++)
                    a[i, j] += less[k, i] * less[k, j] * z[k] / s[k];
            }
        }

        for (var k = 0; k < _e; k++)
        {
            for (var i = 0; i < _n; i++)
                a[_n + k, i] = a[i, _n + k] = equal[k, i];
        }

        return (a, Eliminate(a));
    }

    private static int[] Eliminate(double[,] a)
    {
        var size = a.GetLength(0);
        var order = Enumerable.Range(0, size).ToArray();
        for (var k = 0; k < size; k++)
        {
            var pivot = k;
            for (var i = k + 1; i < size; i++)
                pivot = Math.Abs(a[i, k]) > Math.Abs(a[pivot, k]) ? i : pivot;
            for (var j = 0; pivot != k && j < size; j++)
                (a[k, j], a[pivot, j]) = (a[pivot, j], a[k, j]);
            (order[k], order[pivot]) = (order[pivot], order[k]);
            for (var i = k + 1; i < size; i++)
            {
                a[i, k] /= a[k, k];
                for (var j = k + 1; a[i, k] != 0 && j < size; j++)
                    a[i, j] -= a[i, k] * a[k, j];
            }
        }

        return order;
    }

    private static double[] Back((double[,] Matrix, int[] Order) kkt, double[] right)
    {
        var x = kkt.Order.Select(i => right[i]).ToArray();
        for (var i = 0; i < x.Length; i++)
        {
            for (var j = 0; j < i; j++)
                x[i] -= kkt.Matrix[i, j] * x[j];
        }

        for (var i = x.Length - 1; i >= 0; i--)
        {
            for (var j = i + 1; j < x.Length; j++)
                x[i] -= kkt.Matrix[i, j] * x[j];
            x[i] /= kkt.Matrix[i, i];
        }

        return x;
    }

    private static double Reach(double[] at, double[] step)
    {
        var reach = 1.0;
        for (var i = 0; i < at.Length; i++)
            reach = step[i] < 0 ? Math.Min(reach, -at[i] / step[i]) : reach;
        return reach;
    }

    private static double[] Times(double[,] a, double[] x)
    {
        var result = new double[a.GetLength(0)];
        for (var i = 0; i < result.Length; i++)
        {
            for (var j = 0; j < x.Length; j++)
                result[i] += a[i, j] * x[j];
        }

        return result;
    }

    private static double[] Transposed(double[,] a, double[] y)
    {
        var result = new double[a.GetLength(1)];
        for (var i = 0; i < y.Length; i++)
        {
            for (var j = 0; j < result.Length; j++)
                result[j] += a[i, j] * y[i];
        }

        return result;
    }

    private static double[] Add(double[] a, double[] b, double factor = 1) => [.. a.Zip(b, (x, y) => x + factor * y)];

    private static double Largest(double[] a) => a.Length == 0 ? 0 : a.Max(Math.Abs);
}
