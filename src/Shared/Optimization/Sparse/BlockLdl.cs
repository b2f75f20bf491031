using System.Runtime.CompilerServices;
using System.Runtime.InteropServices;
using System.Runtime.Intrinsics;

namespace Halfvoice.Optimization;

/// <summary>
/// Sparse LDLᵀ of the symmetric block matrix with one 2×2 pivot [[h, b], [b, −d]] per bus and [[h, b], [b, 0]] per edge.
/// With h and d the diagonals of positive semidefinite matrices it is quasi-definite, so that every order of elimination
/// exists (Vanderbei 1995, from memory); taking both unknowns of a bus together keeps the pivot away from zero even where h and
/// d vanish, because b is then a susceptance Laplacian. Row by row ("up-looking"), values only; no allocation after the constructor.
/// </summary>
internal sealed class BlockLdl
{
    // A pivot whose determinant is smaller than this, relative to the squared susceptance of its row, is shifted by
    // the square root of it; iterative refinement of the caller removes what the shift did.
    private const double TinyPivot = 1e-16;
    private const double Shift = 1e-8;

    private readonly SymbolicFactor _pattern;
    private readonly double[] _rowSize;
    private readonly double[] _lower;
    private readonly double[] _inverse;
    private readonly double[] _row;
    private readonly double[] _solution;
    private readonly int[] _next;

    /// <param name="pattern">Pattern of the matrix, in blocks.</param>
    /// <param name="rowSize">By bus: the size of b in its row, the yardstick for a pivot that is next to zero.</param>
    public BlockLdl(SymbolicFactor pattern, double[] rowSize)
    {
        _pattern = pattern;
        _rowSize = rowSize;
        _lower = new double[4 * pattern.ColumnRow.Length];
        _inverse = new double[4 * pattern.Count];
        _row = new double[4 * pattern.Count];
        _solution = new double[2 * pattern.Count];
        _next = new int[pattern.Count];
    }

    /// <summary>Pivots that had to be shifted in the last factorisation.</summary>
    public int ShiftedPivots { get; private set; }

    /// <summary>Factors the matrix; diagonals by bus, off-diagonals by edge, both in the numbering of the grid.</summary>
    public void Factor(double[] diagonalH, double[] diagonalB, double[] diagonalD, double[] edgeH, double[] edgeB)
    {
        ShiftedPivots = 0;
        _pattern.ColumnStart.AsSpan(0, _pattern.Count).CopyTo(_next);
        for (var k = 0; k < _pattern.Count; k++)
        {
            for (var t = _pattern.EntryStart[k]; t < _pattern.EntryStart[k + 1]; t++)
            {
                var edge = _pattern.EntryEdge[t];
                var y = _row.AsSpan(4 * _pattern.EntryColumn[t], 4);
                y[0] = edgeH[edge];
                y[1] = edgeB[edge];
                y[2] = edgeB[edge];
                y[3] = 0;
            }

            var bus = _pattern.Order[k];
            var (h, b, d) = EliminateRow(k, diagonalH[bus], diagonalB[bus], -diagonalD[bus]);
            Invert(k, h, b, d, _rowSize[bus]);
        }
    }

    /// <summary>
    /// Row k of L from the rows above: y_i ← A_ik − Σ_{j&lt;i} L_ij y_j, L_ki = y_iᵀ D_i⁻¹, and D_k = A_kk − Σ L_ki y_i.
    /// </summary>
    private (double H, double B, double D) EliminateRow(int k, double h, double b, double d)
    {
        ref var rows = ref MemoryMarshal.GetArrayDataReference(_pattern.ColumnRow);
        ref var lower = ref MemoryMarshal.GetArrayDataReference(_lower);
        ref var row = ref MemoryMarshal.GetArrayDataReference(_row);
        for (var t = _pattern.RowStart[k]; t < _pattern.RowStart[k + 1]; t++)
        {
            var i = _pattern.RowColumn[t];
            var y = Vector256.LoadUnsafe(ref row, (nuint)(4 * i));
            Vector256<double>.Zero.StoreUnsafe(ref row, (nuint)(4 * i));
            // L y for 2×2 blocks, row-major: the columns of L times the rows of y.
            var upper = Vector256.Create(y.GetLower(), y.GetLower());
            var under = Vector256.Create(y.GetUpper(), y.GetUpper());
            var end = _next[i];
            for (var p = _pattern.ColumnStart[i]; p < end; p++)
            {
                var block = Vector256.LoadUnsafe(ref lower, (nuint)(4 * p));
                var first = Vector256.Shuffle(block, Vector256.Create(0L, 0, 2, 2));
                var second = Vector256.Shuffle(block, Vector256.Create(1L, 1, 3, 3));
                var target = (nuint)(4 * Unsafe.Add(ref rows, p));
                var value = Vector256.LoadUnsafe(ref row, target) - (first * upper) - (second * under);
                value.StoreUnsafe(ref row, target);
            }

            double y00 = y[0], y01 = y[1], y10 = y[2], y11 = y[3];
            double v00 = _inverse[4 * i], v01 = _inverse[(4 * i) + 1], v11 = _inverse[(4 * i) + 3];
            double l00 = (y00 * v00) + (y10 * v01), l01 = (y00 * v01) + (y10 * v11);
            double l10 = (y01 * v00) + (y11 * v01), l11 = (y01 * v01) + (y11 * v11);
            Vector256.Create(l00, l01, l10, l11).StoreUnsafe(ref lower, (nuint)(4 * end));
            _next[i] = end + 1;
            h -= (l00 * y00) + (l01 * y10);
            b -= (l00 * y01) + (l01 * y11);
            d -= (l10 * y01) + (l11 * y11);
        }

        return (h, b, d);
    }

    private void Invert(int k, double h, double b, double d, double size)
    {
        var determinant = (h * d) - (b * b);
        if (!(determinant <= -TinyPivot * size * size) || determinant == 0)
        {
            ShiftedPivots++;
            var shift = Shift * Math.Max(size, 1e-12);
            h = Math.Max(h, 0) + shift;
            d = Math.Min(d, 0) - shift;
            determinant = (h * d) - (b * b);
        }

        _inverse[4 * k] = d / determinant;
        _inverse[(4 * k) + 1] = -b / determinant;
        _inverse[(4 * k) + 2] = -b / determinant;
        _inverse[(4 * k) + 3] = h / determinant;
    }

    /// <summary>Solves for both unknowns of every bus in place.</summary>
    public void Solve(double[] first, double[] second)
    {
        var x = _solution;
        var order = _pattern.Order;
        for (var k = 0; k < order.Length; k++)
        {
            x[2 * k] = first[order[k]];
            x[(2 * k) + 1] = second[order[k]];
        }

        Forward(x);
        Backward(x);
        for (var k = 0; k < order.Length; k++)
        {
            first[order[k]] = x[2 * k];
            second[order[k]] = x[(2 * k) + 1];
        }
    }

    private void Forward(double[] x)
    {
        for (var k = 0; k < _pattern.Count; k++)
        {
            double x0 = x[2 * k], x1 = x[(2 * k) + 1];
            for (var p = _pattern.ColumnStart[k]; p < _pattern.ColumnStart[k + 1]; p++)
            {
                var row = 2 * _pattern.ColumnRow[p];
                x[row] -= (_lower[4 * p] * x0) + (_lower[(4 * p) + 1] * x1);
                x[row + 1] -= (_lower[(4 * p) + 2] * x0) + (_lower[(4 * p) + 3] * x1);
            }
        }
    }

    private void Backward(double[] x)
    {
        for (var k = _pattern.Count - 1; k >= 0; k--)
        {
            double x0 = x[2 * k], x1 = x[(2 * k) + 1];
            double y0 = (_inverse[4 * k] * x0) + (_inverse[(4 * k) + 1] * x1);
            double y1 = (_inverse[(4 * k) + 2] * x0) + (_inverse[(4 * k) + 3] * x1);
            for (var p = _pattern.ColumnStart[k]; p < _pattern.ColumnStart[k + 1]; p++)
            {
                var row = 2 * _pattern.ColumnRow[p];
                y0 -= (_lower[4 * p] * x[row]) + (_lower[(4 * p) + 2] * x[row + 1]);
                y1 -= (_lower[(4 * p) + 1] * x[row]) + (_lower[(4 * p) + 3] * x[row + 1]);
            }

            x[2 * k] = y0;
            x[(2 * k) + 1] = y1;
        }
    }
}
