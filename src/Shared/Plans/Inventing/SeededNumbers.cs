namespace Halfvoice.Plans;

/// <summary>
/// Numbers that follow from a seed alone, for invented plans: SplitMix64 (Steele, Lea and Flood, 2014; constants from
/// memory). Not for noise and not for keys: whoever knows the seed knows every number.
/// </summary>
internal sealed class SeededNumbers(long seed)
{
    private ulong _state = unchecked((ulong)seed);

    public ulong Bits()
    {
        unchecked
        {
            _state += 0x9E3779B97F4A7C15UL;
            var mixed = _state;
            mixed = (mixed ^ (mixed >> 30)) * 0xBF58476D1CE4E5B9UL;
            mixed = (mixed ^ (mixed >> 27)) * 0x94D049BB133111EBUL;
            return mixed ^ (mixed >> 31);
        }
    }

    /// <summary>Uniform in [0, 1), a multiple of 2⁻⁵³.</summary>
    public double Unit() => (Bits() >> 11) * (1.0 / (1UL << 53));

    public double Between(double least, double most) => least + ((most - least) * Unit());

    /// <summary>Between two positive numbers with a uniform logarithm: small ones are as frequent as large ones.</summary>
    public double LogBetween(double least, double most) => least * Math.Pow(most / least, Unit());

    /// <summary>0 to below <paramref name="count"/>; the bias of at most count/2⁶⁴ does not matter here.</summary>
    public int Below(int count) => (int)(Bits() % (ulong)count);

    public T Pick<T>(IReadOnlyList<T> items) => items[Below(items.Count)];

    public void Shuffle<T>(T[] items)
    {
        for (var i = items.Length - 1; i > 0; i--)
        {
            var j = Below(i + 1);
            (items[i], items[j]) = (items[j], items[i]);
        }
    }

    /// <summary>0 to below <paramref name="count"/> in random order.</summary>
    public int[] Order(int count)
    {
        var order = Enumerable.Range(0, count).ToArray();
        Shuffle(order);
        return order;
    }
}
