namespace Halfvoice.Optimization;

/// <summary>
/// The lines held at a limit: their directions, signed multipliers y (positive at +limit, negative at −limit) and the matrix
/// G = (aᵢᵀaⱼ) of their rows with its Cholesky factor, kept up to date as lines come and go. No allocation unless the set grows.
/// </summary>
internal sealed class ActiveLines
{
    private int[] _line = new int[16];
    private double[] _side = new double[16];
    private double[] _multiplier = new double[16];
    private double[] _matrix = new double[16 * 16];
    private double[] _factor = new double[16 * 16];
    private double[] _work = new double[16];
    private int _capacity = 16;

    /// <summary>Number of held lines.</summary>
    public int Count { get; private set; }

    public ReadOnlySpan<int> Lines => _line.AsSpan(0, Count);

    /// <summary>+1 for a line at +limit, −1 at −limit.</summary>
    public ReadOnlySpan<double> Sides => _side.AsSpan(0, Count);

    public Span<double> Multipliers => _multiplier.AsSpan(0, Count);

    public void Clear() => Count = 0;

    public bool Contains(int line) => Lines.Contains(line);

    /// <summary>Room for one more line.</summary>
    public void Reserve()
    {
        if (Count < _capacity)
            return;
        var capacity = 2 * _capacity;
        Array.Resize(ref _line, capacity);
        Array.Resize(ref _side, capacity);
        Array.Resize(ref _multiplier, capacity);
        Array.Resize(ref _work, capacity);
        _matrix = Widened(_matrix, capacity);
        _factor = Widened(_factor, capacity);
        _capacity = capacity;
    }

    private double[] Widened(double[] square, int capacity)
    {
        var wider = new double[capacity * capacity];
        for (var i = 0; i < Count; i++)
            square.AsSpan(i * _capacity, Count).CopyTo(wider.AsSpan(i * capacity));
        return wider;
    }

    /// <summary>Takes a line in.</summary>
    /// <param name="line">Line index.</param>
    /// <param name="side">+1 or −1.</param>
    /// <param name="multiplier">Its signed multiplier.</param>
    /// <param name="products">Products of its row with the rows of the held lines.</param>
    /// <param name="own">Product of its row with itself.</param>
    /// <param name="unexplained">The part of that product that the held rows do not explain, above 0.</param>
    public void Append(int line, double side, double multiplier, ReadOnlySpan<double> products, double own, double unexplained)
    {
        Reserve();
        var k = Count;
        _line[k] = line;
        _side[k] = side;
        _multiplier[k] = multiplier;
        var row = _factor.AsSpan(k * _capacity, k + 1);
        products[..k].CopyTo(row);
        Forward(row[..k]);
        row[k] = Math.Sqrt(unexplained);
        for (var i = 0; i < k; i++)
        {
            _matrix[(k * _capacity) + i] = products[i];
            _matrix[(i * _capacity) + k] = products[i];
        }

        _matrix[(k * _capacity) + k] = own;
        Count = k + 1;
    }

    /// <summary>Lets a line go; rotations (Givens) restore the triangle.</summary>
    public void RemoveAt(int index)
    {
        for (var i = index; i < Count - 1; i++)
        {
            _line[i] = _line[i + 1];
            _side[i] = _side[i + 1];
            _multiplier[i] = _multiplier[i + 1];
            _factor.AsSpan((i + 1) * _capacity, i + 2).CopyTo(_factor.AsSpan(i * _capacity));
            _matrix.AsSpan((i + 1) * _capacity, Count).CopyTo(_matrix.AsSpan(i * _capacity));
        }

        for (var i = 0; i < Count - 1; i++)
        {
            var row = _matrix.AsSpan(i * _capacity, Count);
            row[(index + 1)..].CopyTo(row[index..]);
        }

        Count--;
        for (var i = index; i < Count; i++)
            Rotate(i);
    }

    private void Rotate(int i)
    {
        var a = _factor[(i * _capacity) + i];
        var b = _factor[(i * _capacity) + i + 1];
        var length = Math.Sqrt((a * a) + (b * b));
        double cos = a / length, sin = b / length;
        for (var r = i; r < Count; r++)
        {
            var row = _factor.AsSpan(r * _capacity, _capacity);
            var x = row[i];
            var y = row[i + 1];
            row[i] = (cos * x) + (sin * y);
            row[i + 1] = (cos * y) - (sin * x);
        }
    }

    /// <summary>Solves G x = right.</summary>
    public void Solve(ReadOnlySpan<double> right, Span<double> solution)
    {
        right[..Count].CopyTo(solution);
        Forward(solution[..Count]);
        Backward(solution[..Count]);
    }

    /// <summary>Solves G x = right with one step of refinement.</summary>
    public void SolveRefined(ReadOnlySpan<double> right, Span<double> solution)
    {
        Solve(right, solution);
        var rest = _work.AsSpan(0, Count);
        for (var i = 0; i < Count; i++)
            rest[i] = right[i] - Dense.Dot(_matrix.AsSpan(i * _capacity, Count), solution);
        Forward(rest);
        Backward(rest);
        for (var i = 0; i < Count; i++)
            solution[i] += rest[i];
    }

    private void Forward(Span<double> x)
    {
        for (var i = 0; i < x.Length; i++)
            x[i] = (x[i] - Dense.Dot(_factor.AsSpan(i * _capacity, i), x)) / _factor[(i * _capacity) + i];
    }

    private void Backward(Span<double> x)
    {
        for (var i = x.Length - 1; i >= 0; i--)
        {
            x[i] /= _factor[(i * _capacity) + i];
            Dense.Add(-x[i], _factor.AsSpan(i * _capacity, i), x);
        }
    }
}
