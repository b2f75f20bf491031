using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Agent;

/// <summary>Load readings from the file in the bundle: one snapshot a cycle.</summary>
internal sealed class SeriesReadings : ILoadReadings
{
    private readonly LoadSeries _series;

    public SeriesReadings(LoadSeries series) => _series = series;

    public bool TryRead(int cycle, Span<double> loadMw)
    {
        _series.At(cycle).CopyTo(loadMw);
        return true;
    }
}
