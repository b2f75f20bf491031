using System.Numerics;

namespace Halfvoice.Privacy;

/// <summary>
/// The rank of an integer matrix, exactly, by fraction-free elimination (Bareiss 1968, from memory): every division below
/// has no remainder. Whether a set of constraints is contradictory must not hang on a rounding error.
/// </summary>
internal static class ExactRank
{
    internal static int Of(BigInteger[,] matrix)
    {
        var rows = matrix.GetLength(0);
        var columns = matrix.GetLength(1);
        var m = (BigInteger[,])matrix.Clone();
        var previous = BigInteger.One;
        var rank = 0;
        for (var column = 0; column < columns && rank < rows; column++)
        {
            var pivot = rank;
            while (pivot < rows && m[pivot, column].IsZero)
                pivot++;
            if (pivot == rows)
                continue;
            Swap(m, pivot, rank);
            for (var i = rank + 1; i < rows; i++)
            {
                for (var j = column + 1; j < columns; j++)
                    m[i, j] = (m[rank, column] * m[i, j] - m[i, column] * m[rank, j]) / previous;
                m[i, column] = BigInteger.Zero;
            }

            previous = m[rank, column];
            rank++;
        }

        return rank;
    }

    private static void Swap(BigInteger[,] m, int a, int b)
    {
        for (var j = 0; a != b && j < m.GetLength(1); j++)
            (m[a, j], m[b, j]) = (m[b, j], m[a, j]);
    }
}
