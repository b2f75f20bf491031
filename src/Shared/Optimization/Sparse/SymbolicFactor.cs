namespace Halfvoice.Optimization;

/// <summary>
/// Pattern of the factor L of a symmetric matrix whose off-diagonal pattern is a set of edges: elimination order,
/// elimination tree (Liu 1990, from memory) and both views of L. Computed once per grid; numeric factors only fill values in.
/// All indices but <see cref="Order"/> and <see cref="EntryEdge"/> are positions in the elimination order.
/// </summary>
internal sealed class SymbolicFactor
{
    private const int None = -1;

    private SymbolicFactor(int[] order, int[] edgeA, int[] edgeB)
    {
        Count = order.Length;
        Order = order;
        Position = new int[Count];
        for (var k = 0; k < Count; k++)
            Position[order[k]] = k;
        (EntryStart, EntryColumn, EntryEdge) = UpperEntries(edgeA, edgeB);
        Parent = Tree();
        (RowStart, RowColumn, ColumnStart, ColumnRow) = Pattern();
    }

    /// <summary>Size of the matrix.</summary>
    public int Count { get; }

    /// <summary>Order[k] is the row that is eliminated k-th.</summary>
    public int[] Order { get; }

    /// <summary>Inverse of <see cref="Order"/>.</summary>
    public int[] Position { get; }

    /// <summary>Matrix entries above the diagonal of column k are EntryStart[k] to EntryStart[k + 1] − 1.</summary>
    public int[] EntryStart { get; }

    /// <summary>Row (less than k) of a matrix entry.</summary>
    public int[] EntryColumn { get; }

    /// <summary>Edge that a matrix entry belongs to.</summary>
    public int[] EntryEdge { get; }

    /// <summary>Row k of L has entries RowStart[k] to RowStart[k + 1] − 1, columns ascending.</summary>
    public int[] RowStart { get; }

    public int[] RowColumn { get; }

    /// <summary>Column i of L below the diagonal has entries ColumnStart[i] to ColumnStart[i + 1] − 1, rows ascending.</summary>
    public int[] ColumnStart { get; }

    public int[] ColumnRow { get; }

    private int[] Parent { get; }

    /// <summary>Orders and analyses the pattern of <paramref name="count"/> rows with the given distinct edges.</summary>
    public static SymbolicFactor Of(int count, int[] edgeA, int[] edgeB)
    {
        var start = new int[count + 1];
        for (var e = 0; e < edgeA.Length; e++)
        {
            start[edgeA[e] + 1]++;
            start[edgeB[e] + 1]++;
        }

        for (var i = 0; i < count; i++)
            start[i + 1] += start[i];
        var next = start.AsSpan(0, count).ToArray();
        var neighbours = new int[2 * edgeA.Length];
        for (var e = 0; e < edgeA.Length; e++)
        {
            neighbours[next[edgeA[e]]++] = edgeB[e];
            neighbours[next[edgeB[e]]++] = edgeA[e];
        }

        var first = new SymbolicFactor(MinimumDegree.Order(count, start, neighbours), edgeA, edgeB);
        // A postorder of the tree leaves the fill as it is and puts columns that are used together next to each other.
        var post = first.Postorder();
        return new SymbolicFactor(Array.ConvertAll(post, k => first.Order[k]), edgeA, edgeB);
    }

    private (int[] Start, int[] Column, int[] Edge) UpperEntries(int[] edgeA, int[] edgeB)
    {
        var start = new int[Count + 1];
        for (var e = 0; e < edgeA.Length; e++)
            start[Math.Max(Position[edgeA[e]], Position[edgeB[e]]) + 1]++;
        for (var k = 0; k < Count; k++)
            start[k + 1] += start[k];
        var next = start.AsSpan(0, Count).ToArray();
        var column = new int[edgeA.Length];
        var edge = new int[edgeA.Length];
        for (var e = 0; e < edgeA.Length; e++)
        {
            var a = Position[edgeA[e]];
            var b = Position[edgeB[e]];
            var slot = next[Math.Max(a, b)]++;
            column[slot] = Math.Min(a, b);
            edge[slot] = e;
        }

        return (start, column, edge);
    }

    /// <summary>Parent of column i: the row of its first entry below the diagonal.</summary>
    private int[] Tree()
    {
        var parent = new int[Count];
        var ancestor = new int[Count];
        Array.Fill(parent, None);
        Array.Fill(ancestor, None);
        for (var k = 0; k < Count; k++)
        {
            for (var t = EntryStart[k]; t < EntryStart[k + 1]; t++)
            {
                for (var i = EntryColumn[t]; i != None && i < k;)
                {
                    var up = ancestor[i];
                    ancestor[i] = k;
                    if (up == None)
                        parent[i] = k;
                    i = up;
                }
            }
        }

        return parent;
    }

    private int[] Postorder()
    {
        var firstChild = new int[Count];
        var sibling = new int[Count];
        Array.Fill(firstChild, None);
        Array.Fill(sibling, None);
        for (var i = Count - 1; i >= 0; i--)
        {
            if (Parent[i] == None)
                continue;
            sibling[i] = firstChild[Parent[i]];
            firstChild[Parent[i]] = i;
        }

        var post = new int[Count];
        var filled = 0;
        var stack = new Stack<int>();
        for (var root = 0; root < Count; root++)
        {
            if (Parent[root] != None)
                continue;
            stack.Push(root);
            while (stack.TryPeek(out var node))
            {
                var child = firstChild[node];
                if (child == None)
                {
                    post[filled++] = stack.Pop();
                    continue;
                }

                firstChild[node] = sibling[child];
                stack.Push(child);
            }
        }

        return post;
    }

    /// <summary>Row k of L holds the columns on the tree paths from the entries of column k of the matrix up to k.</summary>
    private (int[] RowStart, int[] RowColumn, int[] ColumnStart, int[] ColumnRow) Pattern()
    {
        var mark = new int[Count];
        Array.Fill(mark, None);
        var rowStart = new int[Count + 1];
        var columnStart = new int[Count + 1];
        var found = new List<int>(4 * EntryColumn.Length);
        for (var k = 0; k < Count; k++)
        {
            mark[k] = k;
            for (var t = EntryStart[k]; t < EntryStart[k + 1]; t++)
            {
                for (var i = EntryColumn[t]; mark[i] != k; i = Parent[i])
                {
                    mark[i] = k;
                    columnStart[i + 1]++;
                    found.Add(i);
                }
            }

            rowStart[k + 1] = found.Count;
        }

        for (var i = 0; i < Count; i++)
            columnStart[i + 1] += columnStart[i];
        // Sorting twice by counting: rows into columns (ascending rows), then columns into rows (ascending columns).
        var next = columnStart.AsSpan(0, Count).ToArray();
        var columnRow = new int[found.Count];
        for (var k = 0; k < Count; k++)
        {
            for (var t = rowStart[k]; t < rowStart[k + 1]; t++)
                columnRow[next[found[t]]++] = k;
        }

        var rowColumn = new int[found.Count];
        rowStart.AsSpan(0, Count).CopyTo(next);
        for (var i = 0; i < Count; i++)
        {
            for (var t = columnStart[i]; t < columnStart[i + 1]; t++)
                rowColumn[next[columnRow[t]]++] = i;
        }

        return (rowStart, rowColumn, columnStart, columnRow);
    }
}
