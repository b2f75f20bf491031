namespace Halfvoice.Optimization;

/// <summary>
/// Fill-reducing elimination order of a symmetric pattern: approximate minimum degree on a quotient graph
/// (Amestoy, Davis, Duff 1996, from memory). An eliminated vertex becomes an element, which stands for the clique that its
/// elimination would create; degrees are bounded from above by counting each element outside the newest one once.
/// Vertices with equal neighbourhoods are merged and eliminated together. Equal input gives equal output.
/// </summary>
internal sealed class MinimumDegree
{
    private const int None = -1;

    private readonly int _count;

    // Per vertex: its elements first, then its plain neighbours. A vertex gains one element and loses at least one entry
    // whenever a pivot touches it, so the lists never outgrow the space of the original neighbours.
    private readonly int[] _list;
    private readonly int[] _start;
    private readonly int[] _length;
    private readonly int[] _elementCount;

    // Vertices that a merged vertex stands for; 0 once it is merged into another or eliminated.
    private readonly int[] _weight;
    private readonly int[] _degree;
    private readonly int[] _memberNext;
    private readonly int[] _memberLast;

    // Doubly linked lists of the vertices of equal degree.
    private readonly int[] _degreeHead;
    private readonly int[] _degreeNext;
    private readonly int[] _degreePrevious;
    private int _leastDegree;

    // Elements: their vertices in a pool that only grows, and the vertices that they stand for (0 once absorbed).
    private int[] _pool;
    private int _poolUsed;
    private readonly int[] _elementStart;
    private readonly int[] _elementLength;
    private readonly int[] _elementWeight;

    private readonly int[] _mark;
    private int _stamp;
    private readonly int[] _outside;
    private readonly int[] _outsideStamp;
    private readonly int[] _hashHead;
    private readonly int[] _hashNext;
    private readonly int[] _hash;
    private int _eliminated;

    private MinimumDegree(int count, int[] start, int[] neighbours)
    {
        _count = count;
        _list = (int[])neighbours.Clone();
        _start = start;
        _length = new int[count];
        _elementCount = new int[count];
        _weight = new int[count];
        _degree = new int[count];
        _memberNext = new int[count];
        _memberLast = new int[count];
        _degreeHead = new int[count + 1];
        _degreeNext = new int[count];
        _degreePrevious = new int[count];
        _pool = new int[Math.Max(16, 2 * neighbours.Length)];
        _elementStart = new int[count];
        _elementLength = new int[count];
        _elementWeight = new int[count];
        _mark = new int[count];
        _outside = new int[count];
        _outsideStamp = new int[count];
        _hashHead = new int[count];
        _hashNext = new int[count];
        _hash = new int[count];
        Array.Fill(_degreeHead, None);
        Array.Fill(_hashHead, None);
        Array.Fill(_memberNext, None);
        for (var i = count - 1; i >= 0; i--)
        {
            _length[i] = start[i + 1] - start[i];
            _weight[i] = 1;
            _memberLast[i] = i;
            _degree[i] = _length[i];
            Link(i);
        }

        _leastDegree = 0;
    }

    /// <summary>Order in which to eliminate: entry k is the vertex that goes k-th.</summary>
    /// <param name="count">Number of vertices.</param>
    /// <param name="start">Neighbours of vertex i are entries start[i] to start[i + 1] − 1; count + 1 long.</param>
    /// <param name="neighbours">Symmetric, without loops and without repetitions.</param>
    public static int[] Order(int count, int[] start, int[] neighbours)
    {
        var work = new MinimumDegree(count, start, neighbours);
        var pivots = new List<int>(count);
        while (work._eliminated < count)
            pivots.Add(work.Eliminate());
        var order = new int[count];
        var filled = 0;
        foreach (var pivot in pivots)
        {
            for (var member = pivot; member != None; member = work._memberNext[member])
                order[filled++] = member;
        }

        return order;
    }

    private int Eliminate()
    {
        while (_degreeHead[_leastDegree] == None)
            _leastDegree++;
        var pivot = _degreeHead[_leastDegree];
        Unlink(pivot);
        _eliminated += _weight[pivot];
        FormElement(pivot);
        MeasureOutside(pivot);
        UpdateMembers(pivot);
        MergeTwins(pivot);
        Reinsert(pivot);
        return pivot;
    }

    /// <summary>The pivot's neighbours, its elements included, become the vertices of a new element; those elements are absorbed.</summary>
    private void FormElement(int pivot)
    {
        _weight[pivot] = 0;
        _stamp++;
        _elementStart[pivot] = _poolUsed;
        var weight = 0;
        for (var t = 0; t < _elementCount[pivot]; t++)
        {
            var element = _list[_start[pivot] + t];
            if (_elementWeight[element] == 0)
                continue;
            for (var k = 0; k < _elementLength[element]; k++)
                weight += Join(_pool[_elementStart[element] + k]);
            _elementWeight[element] = 0;
        }

        for (var t = _elementCount[pivot]; t < _length[pivot]; t++)
            weight += Join(_list[_start[pivot] + t]);
        _elementLength[pivot] = _poolUsed - _elementStart[pivot];
        _elementWeight[pivot] = weight;
    }

    private int Join(int vertex)
    {
        if (_weight[vertex] == 0 || _mark[vertex] == _stamp)
            return 0;
        _mark[vertex] = _stamp;
        if (_poolUsed == _pool.Length)
            Array.Resize(ref _pool, 2 * _pool.Length);
        _pool[_poolUsed++] = vertex;
        Unlink(vertex);
        return _weight[vertex];
    }

    /// <summary>For every element e that touches the new element p: how many vertices of e are outside p.</summary>
    private void MeasureOutside(int pivot)
    {
        for (var k = 0; k < _elementLength[pivot]; k++)
        {
            var vertex = _pool[_elementStart[pivot] + k];
            for (var t = 0; t < _elementCount[vertex]; t++)
            {
                var element = _list[_start[vertex] + t];
                if (_elementWeight[element] == 0)
                    continue;
                if (_outsideStamp[element] != _stamp)
                {
                    _outsideStamp[element] = _stamp;
                    _outside[element] = _elementWeight[element];
                }

                _outside[element] -= _weight[vertex];
            }
        }
    }

    private void UpdateMembers(int pivot)
    {
        var first = _elementStart[pivot];
        for (var k = 0; k < _elementLength[pivot]; k++)
        {
            var vertex = _pool[first + k];
            var reach = Prune(vertex, pivot);
            if (reach > 0)
            {
                _degree[vertex] = Math.Min(_degree[vertex], reach);
                continue;
            }

            // Nothing outside the new element is left: the vertex can go right after the pivot without any further fill.
            _elementWeight[pivot] -= _weight[vertex];
            _eliminated += _weight[vertex];
            Absorb(pivot, vertex);
        }
    }

    /// <summary>Drops what the new element covers from a vertex's list, enters the element, and bounds the degree outside it.</summary>
    private int Prune(int vertex, int pivot)
    {
        var start = _start[vertex];
        var write = start;
        var reach = 0;
        var hash = pivot;
        for (var t = start; t < start + _elementCount[vertex]; t++)
        {
            var element = _list[t];
            if (_elementWeight[element] == 0)
                continue;
            if (_outside[element] == 0)
            {
                _elementWeight[element] = 0;
                continue;
            }

            reach += _outside[element];
            hash = unchecked(hash + element);
            _list[write++] = element;
        }

        var firstVariable = write;
        for (var t = start + _elementCount[vertex]; t < start + _length[vertex]; t++)
        {
            var other = _list[t];
            if (_weight[other] == 0 || _mark[other] == _stamp)
                continue;
            reach += _weight[other];
            hash = unchecked(hash + other);
            _list[write++] = other;
        }

        // At least one entry has gone (the pivot itself or an absorbed element), so there is room for the new element.
        _list[write] = firstVariable < write ? _list[firstVariable] : pivot;
        _list[firstVariable] = pivot;
        _elementCount[vertex] = firstVariable - start + 1;
        _length[vertex] = write - start + 1;
        _hash[vertex] = (int)((uint)hash % (uint)_count);
        return reach;
    }

    /// <summary>Vertices of the new element with equal lists are one from now on.</summary>
    private void MergeTwins(int pivot)
    {
        var first = _elementStart[pivot];
        for (var k = 0; k < _elementLength[pivot]; k++)
        {
            var vertex = _pool[first + k];
            if (_weight[vertex] == 0)
                continue;
            var bucket = _hash[vertex];
            _hashNext[vertex] = _hashHead[bucket];
            _hashHead[bucket] = vertex;
        }

        for (var k = 0; k < _elementLength[pivot]; k++)
        {
            var bucket = _hash[_pool[first + k]];
            for (var vertex = _hashHead[bucket]; vertex != None; vertex = _hashNext[vertex])
                MergeTwinsOf(vertex);
            _hashHead[bucket] = None;
        }
    }

    private void MergeTwinsOf(int vertex)
    {
        if (_hashNext[vertex] == None)
            return;
        _stamp++;
        for (var t = 0; t < _length[vertex]; t++)
            _mark[_list[_start[vertex] + t]] = _stamp;
        var previous = vertex;
        for (var other = _hashNext[vertex]; other != None; other = _hashNext[other])
        {
            if (!SameList(vertex, other))
            {
                previous = other;
                continue;
            }

            _weight[vertex] += _weight[other];
            _degree[vertex] -= _weight[other];
            Absorb(vertex, other);
            _hashNext[previous] = _hashNext[other];
        }
    }

    private bool SameList(int vertex, int other)
    {
        if (_length[vertex] != _length[other] || _elementCount[vertex] != _elementCount[other])
            return false;
        for (var t = 0; t < _length[other]; t++)
        {
            if (_mark[_list[_start[other] + t]] != _stamp)
                return false;
        }

        return true;
    }

    private void Absorb(int keeper, int vertex)
    {
        _weight[vertex] = 0;
        _memberNext[_memberLast[keeper]] = vertex;
        _memberLast[keeper] = _memberLast[vertex];
    }

    private void Reinsert(int pivot)
    {
        var first = _elementStart[pivot];
        var write = first;
        for (var k = 0; k < _elementLength[pivot]; k++)
        {
            var vertex = _pool[first + k];
            if (_weight[vertex] == 0)
                continue;
            var degree = _degree[vertex] + _elementWeight[pivot] - _weight[vertex];
            _degree[vertex] = Math.Max(0, Math.Min(degree, _count - _eliminated - _weight[vertex]));
            Link(vertex);
            _pool[write++] = vertex;
        }

        _elementLength[pivot] = write - first;
        _poolUsed = write;
    }

    private void Link(int vertex)
    {
        var degree = _degree[vertex];
        var head = _degreeHead[degree];
        _degreeNext[vertex] = head;
        _degreePrevious[vertex] = None;
        if (head != None)
            _degreePrevious[head] = vertex;
        _degreeHead[degree] = vertex;
        _leastDegree = Math.Min(_leastDegree, degree);
    }

    private void Unlink(int vertex)
    {
        var next = _degreeNext[vertex];
        var previous = _degreePrevious[vertex];
        if (next != None)
            _degreePrevious[next] = previous;
        if (previous != None)
            _degreeNext[previous] = next;
        else
            _degreeHead[_degree[vertex]] = next;
    }
}
