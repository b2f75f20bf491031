namespace Halfvoice.Optimization;

/// <summary>
/// The factor that a dual active-set method carries along: for the Hessian H = L Lᵀ and the signed normals N of the
/// active rows, a matrix J with Jᵀ H J = I and Jᵀ N = [R; 0], R upper triangular (Goldfarb and Idnani 1983, from
/// memory). Adding and dropping a row are sequences of plane rotations.
/// </summary>
internal sealed class ActiveFactor
{
    private readonly int _n;
    private readonly double[] _rows;
    private readonly double[] _start;
    private readonly double[] _columns;
    private readonly double[] _triangle;
    private readonly int[] _active;
    private readonly int[] _sign;

    /// <exception cref="ArgumentException">The Hessian is not positive definite.</exception>
    public ActiveFactor(ReadOnlySpan<double> hessian, int variables, double[] rows)
    {
        _n = variables;
        _rows = rows;
        _start = InverseOfCholesky(hessian, variables);
        _columns = (double[])_start.Clone();
        _triangle = new double[variables * variables];
        _active = new int[variables];
        _sign = new int[variables];
    }

    /// <summary>Number of active rows.</summary>
    public int Count { get; private set; }

    /// <summary>Rotation sequences since the factor was last built from scratch; rounding grows with it.</summary>
    public int Changes { get; private set; }

    /// <summary>The active rows in the order of R's columns.</summary>
    public ReadOnlySpan<int> Active => _active.AsSpan(0, Count);

    /// <summary>+1 where the row presses from below (row · x ≥ lower), −1 where from above.</summary>
    public ReadOnlySpan<int> Sign => _sign.AsSpan(0, Count);

    public ReadOnlySpan<double> Row(int row) => _rows.AsSpan(row * _n, _n);

    /// <summary>Back to no active rows.</summary>
    public void Clear()
    {
        _start.CopyTo(_columns, 0);
        Count = 0;
        Changes = 0;
    }

    /// <summary>d = sign · Jᵀ v.</summary>
    public void Project(ReadOnlySpan<double> v, int sign, Span<double> d)
    {
        for (var j = 0; j < _n; j++)
            d[j] = sign * DenseKernels.Dot(v, _columns.AsSpan(j * _n, _n));
    }

    /// <summary>x = Σ_j v_j J_j over the columns from <paramref name="first"/> on.</summary>
    public void Combine(ReadOnlySpan<double> v, int first, Span<double> x)
    {
        x.Clear();
        for (var j = first; j < _n; j++)
            DenseKernels.AddScaled(x, v[j], _columns.AsSpan(j * _n, _n));
    }

    /// <summary>r = R⁻¹ r in place.</summary>
    public void SolveTriangle(Span<double> r)
    {
        for (var c = Count - 1; c >= 0; c--)
        {
            var column = _triangle.AsSpan(c * _n, c + 1);
            r[c] /= column[c];
            DenseKernels.AddScaled(r, -r[c], column[..c]);
        }
    }

    /// <summary>v = R⁻ᵀ v in place.</summary>
    public void SolveTransposed(Span<double> v)
    {
        for (var c = 0; c < Count; c++)
        {
            var column = _triangle.AsSpan(c * _n, c + 1);
            v[c] = (v[c] - DenseKernels.Dot(column[..c], v)) / column[c];
        }
    }

    /// <summary>Makes a row active whose d = sign · Jᵀ a has just been computed; d is used up.</summary>
    public void Add(int row, int sign, Span<double> d)
    {
        for (var j = _n - 1; j > Count; j--)
        {
            if (d[j] == 0)
                continue;
            var length = Math.Sqrt((d[j - 1] * d[j - 1]) + (d[j] * d[j]));
            DenseKernels.Rotate(_columns.AsSpan((j - 1) * _n, _n), _columns.AsSpan(j * _n, _n), d[j - 1] / length, d[j] / length);
            d[j - 1] = length;
            d[j] = 0;
        }

        d[..(Count + 1)].CopyTo(_triangle.AsSpan(Count * _n));
        _active[Count] = row;
        _sign[Count] = sign;
        Count++;
        Changes++;
    }

    /// <summary>Drops the active row at a position.</summary>
    public void Drop(int position)
    {
        for (var c = position; c + 1 < Count; c++)
        {
            _active[c] = _active[c + 1];
            _sign[c] = _sign[c + 1];
            _triangle.AsSpan((c + 1) * _n, c + 2).CopyTo(_triangle.AsSpan(c * _n));
        }

        Count--;
        Changes++;
        for (var i = position; i < Count; i++)
        {
            // Column i now reaches one entry below the diagonal; rotate rows i and i + 1 to clear it.
            var low = _triangle[(i * _n) + i + 1];
            if (low == 0)
                continue;
            var high = _triangle[(i * _n) + i];
            var length = Math.Sqrt((high * high) + (low * low));
            double cosine = high / length, sine = low / length;
            for (var c = i; c < Count; c++)
            {
                var at = (c * _n) + i;
                (_triangle[at], _triangle[at + 1]) =
                    ((cosine * _triangle[at]) + (sine * _triangle[at + 1]), (cosine * _triangle[at + 1]) - (sine * _triangle[at]));
            }

            DenseKernels.Rotate(_columns.AsSpan(i * _n, _n), _columns.AsSpan((i + 1) * _n, _n), cosine, sine);
        }
    }

    /// <summary>L⁻¹ by rows, which is (L⁻ᵀ) by columns: the J of an empty active set.</summary>
    private static double[] InverseOfCholesky(ReadOnlySpan<double> hessian, int n)
    {
        var lower = new double[n * n];
        for (var j = 0; j < n; j++)
        {
            for (var i = j; i < n; i++)
            {
                var sum = hessian[(i * n) + j];
                for (var k = 0; k < j; k++)
                    sum -= lower[(i * n) + k] * lower[(j * n) + k];
                if (i == j && !(sum > 0))
                    throw new ArgumentException("The Hessian is not positive definite.", nameof(hessian));
                lower[(i * n) + j] = i == j ? Math.Sqrt(sum) : sum / lower[(j * n) + j];
            }
        }

        var inverse = new double[n * n];
        for (var j = 0; j < n; j++)
        {
            inverse[(j * n) + j] = 1 / lower[(j * n) + j];
            for (var i = j + 1; i < n; i++)
            {
                var sum = 0.0;
                for (var k = j; k < i; k++)
                    sum -= lower[(i * n) + k] * inverse[(k * n) + j];
                inverse[(i * n) + j] = sum / lower[(i * n) + i];
            }
        }

        return inverse;
    }
}
