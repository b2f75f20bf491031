using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>The grid while it is being read.</summary>
internal sealed class GridDraft
{
    public List<Bus> Buses { get; } = [];

    /// <summary>Index of each bus and the line that named it.</summary>
    public Dictionary<string, (int Index, int Line)> BusAt { get; } = new(StringComparer.Ordinal);

    /// <summary>Sites by name, found whatever their case; the name as first written and the line.</summary>
    public Dictionary<string, (string Name, int Line)> Sites { get; } = new(StringComparer.OrdinalIgnoreCase);

    /// <summary>The file that names the buses, for messages.</summary>
    public string BusSource { get; init; } = PlanFileRules.Buses;

    public List<Line> Lines { get; } = [];

    public List<Generator> Generators { get; } = [];

    /// <summary>
    /// True if the bus list can be trusted to name every bus, so that a bus that it does not name is an error elsewhere.
    /// Without it, one wrong header would draw an error for every line of every other file.
    /// </summary>
    public bool BusesAreComplete { get; set; }
}
