namespace Halfvoice.Plans;

/// <summary>The loads of a site at one time while they are being read.</summary>
internal sealed class Snapshot(string label, LoadTime time, int line, int buses)
{
    private readonly bool[] _given = new bool[buses];

    public string Label => label;

    public LoadTime Time => time;

    public int Line => line;

    public double[] LoadMw { get; } = new double[buses];

    public bool Gives(int bus) => _given[bus];

    public bool Put(int bus, double loadMw)
    {
        if (_given[bus])
            return false;
        _given[bus] = true;
        LoadMw[bus] = loadMw;
        return true;
    }
}
