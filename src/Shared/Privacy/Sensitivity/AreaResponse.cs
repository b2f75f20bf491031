namespace Halfvoice.Privacy;

/// <summary>
/// The response of one active set: the copies' movement of least ½·‖y‖²_W under which the fixed buses' net injections
/// change by −1 at one bus and by 0 at the others. Inner angles are eliminated first, then the weighted least-squares
/// solution is y = W⁻¹·R̃ᵀ·(R̃·W⁻¹·R̃ᵀ)⁻¹·r. Proof: <c>angle.proof.md</c>, part 4.
/// </summary>
internal sealed class AreaResponse
{
    /// <summary>Pivots below this fraction of full size are looked at exactly; above it rounding stays inside the allowance.</summary>
    private const double SafePivot = 1e-8;

    private readonly AreaGroups _groups;
    private readonly int[] _fixed;
    private readonly int[] _inner;
    private readonly int[] _outer;
    private readonly double[,] _rows;
    private readonly bool[] _used;

    private AreaResponse(AreaGroups groups, int[] fixedBuses)
    {
        _groups = groups;
        _fixed = fixedBuses;
        var all = Enumerable.Range(0, groups.Weight.Length);
        _inner = [.. all.Where(g => groups.Weight[g] == 0)];
        _outer = [.. all.Where(g => groups.Weight[g] > 0)];

        // Columns: inner groups, outer groups, then one right-hand side for each fixed bus.
        _rows = new double[fixedBuses.Length, _inner.Length + _outer.Length + fixedBuses.Length];
        _used = new bool[fixedBuses.Length];
        for (var i = 0; i < fixedBuses.Length; i++)
        {
            for (var c = 0; c < _inner.Length; c++)
                _rows[i, c] = groups.Balance[fixedBuses[i], _inner[c]];
            for (var c = 0; c < _outer.Length; c++)
                _rows[i, _inner.Length + c] = groups.Balance[fixedBuses[i], _outer[c]];
            _rows[i, _inner.Length + _outer.Length + i] = -1;
        }
    }

    /// <summary>
    /// The greatest L1 response per MW over the fixed buses; 0 where the set is contradictory (another set then covers it);
    /// null where contradiction cannot be told from a tiny pivot by the accuracy at hand.
    /// </summary>
    internal static double? Worst(AreaGroups groups, int[] fixedBuses)
    {
        var response = new AreaResponse(groups, fixedBuses);
        if (response.EliminateInner() is not { } eliminated)
            return null;
        var left = fixedBuses.Length - eliminated;
        return left == 0 ? 0 : response.LeastSquares(left);
    }

    /// <summary>Gauss-Jordan elimination of the inner columns with complete pivoting; the rows used up constrain nothing else.</summary>
    private int? EliminateInner()
    {
        var rank = 0;
        var done = new bool[_inner.Length];
        while (rank < Math.Min(_inner.Length, _fixed.Length))
        {
            var (row, column, size) = LargestInner(done);
            if (size < SafePivot * Scale(row < 0 ? 0 : row))
            {
                if (_groups.Rank(_fixed, _inner) != rank)
                    return null;
                break;
            }

            _used[row] = done[column] = true;
            rank++;
            for (var i = 0; i < _fixed.Length; i++)
            {
                if (_used[i])
                    continue;
                var factor = _rows[i, column] / _rows[row, column];
                for (var j = 0; j < _rows.GetLength(1); j++)
                    _rows[i, j] -= factor * _rows[row, j];
                _rows[i, column] = 0;
            }
        }

        return rank;
    }

    private (int Row, int Column, double Size) LargestInner(bool[] done)
    {
        var best = (Row: -1, Column: -1, Size: 0.0);
        for (var i = 0; i < _fixed.Length; i++)
        {
            for (var c = 0; c < _inner.Length; c++)
            {
                if (!_used[i] && !done[c] && Math.Abs(_rows[i, c]) > best.Size)
                    best = (i, c, Math.Abs(_rows[i, c]));
            }
        }

        return best;
    }

    /// <summary>The size of a fixed bus's original row.</summary>
    private double Scale(int row)
    {
        var size = 0.0;
        for (var g = 0; g < _groups.Weight.Length; g++)
            size = Math.Max(size, Math.Abs(_groups.Balance[_fixed[row], g]));
        return size;
    }

    private double? LeastSquares(int left)
    {
        var rows = new int[left];
        for (int i = 0, k = 0; i < _fixed.Length; i++)
        {
            if (!_used[i])
                rows[k++] = i;
        }

        var gram = new double[left, left];
        var certainty = 1.0;
        for (var i = 0; i < left; i++)
        {
            for (var j = 0; j <= i; j++)
                gram[i, j] = Inner(rows[i], rows[j]);
            certainty = Math.Min(certainty, Kept(rows[i]));
        }

        certainty = Math.Min(certainty, Factor(gram));
        if (certainty < SafePivot)
            return _groups.Rank(_fixed, [.. _inner, .. _outer]) < _fixed.Length ? 0 : null;
        var worst = 0.0;
        for (var bus = 0; bus < _fixed.Length; bus++)
            worst = Math.Max(worst, L1(gram, rows, bus));

        // Rounding of the factor is magnified by no more than the inverse of the least pivots' product.
        return worst * (1 + 1e-12 / certainty);
    }

    /// <summary>What the elimination of inner angles left of a row, squared, against the size it had: cancelling loses digits.</summary>
    private double Kept(int row)
    {
        var sum = 0.0;
        for (var c = 0; c < _outer.Length; c++)
            sum += _rows[row, _inner.Length + c] * _rows[row, _inner.Length + c];
        return sum / (Scale(row) * Scale(row));
    }

    private double Inner(int a, int b)
    {
        var sum = 0.0;
        for (var c = 0; c < _outer.Length; c++)
            sum += _rows[a, _inner.Length + c] * _rows[b, _inner.Length + c] / _groups.Weight[_outer[c]];
        return sum;
    }

    /// <summary>
    /// Cholesky factor in place; returns the product of the pivots as fractions of their diagonals, which is the squared
    /// volume that the rows span and 0 where they are dependent.
    /// </summary>
    private static double Factor(double[,] gram)
    {
        var volume = 1.0;
        for (var j = 0; j < gram.GetLength(0); j++)
        {
            var diagonal = gram[j, j];
            var pivot = diagonal;
            for (var k = 0; k < j; k++)
                pivot -= gram[j, k] * gram[j, k];
            if (!(pivot > 0))
                return 0;
            volume *= pivot / diagonal;
            gram[j, j] = Math.Sqrt(pivot);
            for (var i = j + 1; i < gram.GetLength(0); i++)
            {
                for (var k = 0; k < j; k++)
                    gram[i, j] -= gram[i, k] * gram[j, k];
                gram[i, j] /= gram[j, j];
            }
        }

        return volume;
    }

    private double L1(double[,] factor, int[] rows, int bus)
    {
        var n = rows.Length;
        var column = _inner.Length + _outer.Length + bus;
        var x = new double[n];
        for (var i = 0; i < n; i++)
        {
            x[i] = _rows[rows[i], column];
            for (var k = 0; k < i; k++)
                x[i] -= factor[i, k] * x[k];
            x[i] /= factor[i, i];
        }

        for (var i = n - 1; i >= 0; i--)
        {
            for (var k = i + 1; k < n; k++)
                x[i] -= factor[k, i] * x[k];
            x[i] /= factor[i, i];
        }

        var sum = 0.0;
        for (var c = 0; c < _outer.Length; c++)
        {
            var y = 0.0;
            for (var i = 0; i < n; i++)
                y += _rows[rows[i], _inner.Length + c] * x[i];
            sum += _groups.Copies[_outer[c]] * Math.Abs(y) / _groups.Weight[_outer[c]];
        }

        return sum;
    }
}
