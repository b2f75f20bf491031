namespace Halfvoice.Plans;

/// <summary>A site's loads over time: one snapshot a cycle, the last one held when cycles outnumber snapshots.</summary>
public sealed class LoadSeries
{
    private readonly double[][] _snapshots;

    /// <param name="times">Labels of the snapshots as the file gave them; empty for a file without times.</param>
    /// <param name="snapshots">At least one; each in the order of the site's buses, MW, finite; may be negative.</param>
    public LoadSeries(IReadOnlyList<string> times, double[][] snapshots)
    {
        if (snapshots.Length == 0)
            throw new ArgumentException("A load series has at least one snapshot.", nameof(snapshots));
        Times = times;
        _snapshots = snapshots;
    }

    public IReadOnlyList<string> Times { get; }

    public int Count => _snapshots.Length;

    /// <summary>Loads of a cycle (1-based), MW, in the order of the site's buses.</summary>
    public double[] At(int cycle) => _snapshots[Math.Clamp(cycle - 1, 0, _snapshots.Length - 1)];
}
