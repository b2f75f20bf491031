namespace Halfvoice.Grid;

/// <summary>
/// The grid of a plan: buses, lines and generators, with the look-ups that everything else leans on. Immutable.
/// Validation of user input happens in Plans; this class only refuses what would break its own indices.
/// </summary>
public sealed class Network
{
    private readonly int[][] _generatorsAt;
    private readonly int[][] _linesAt;
    private readonly Dictionary<string, int[]> _busesOf;

    /// <exception cref="ArgumentException">A line or generator points outside the bus list, or a line joins a bus to itself.</exception>
    public Network(double baseMva, IReadOnlyList<Bus> buses, IReadOnlyList<Line> lines, IReadOnlyList<Generator> generators)
    {
        if (!(baseMva > 0) || !double.IsFinite(baseMva))
            throw new ArgumentException("The base must be a positive number of MVA.", nameof(baseMva));
        BaseMva = baseMva;
        Buses = buses;
        Lines = lines;
        Generators = generators;
        _generatorsAt = Group(generators.Count, i => generators[i].Bus, "generator");
        var ends = new List<int>[buses.Count];
        for (var i = 0; i < ends.Length; i++)
            ends[i] = [];
        for (var l = 0; l < lines.Count; l++)
        {
            var line = lines[l];
            if ((uint)line.FromBus >= (uint)buses.Count || (uint)line.ToBus >= (uint)buses.Count || line.FromBus == line.ToBus)
                throw new ArgumentException($"Line {line.Name} does not join two different buses of the network.");
            ends[line.FromBus].Add(l);
            ends[line.ToBus].Add(l);
        }

        _linesAt = Array.ConvertAll(ends, list => list.ToArray());
        _busesOf = buses.Select((bus, i) => (bus.Site, i)).GroupBy(pair => pair.Site)
            .ToDictionary(group => group.Key, group => group.Select(pair => pair.i).ToArray(), StringComparer.Ordinal);
        Sites = buses.Select(bus => bus.Site).Distinct(StringComparer.Ordinal).ToArray();
    }

    /// <summary>Power base, MVA.</summary>
    public double BaseMva { get; }

    public IReadOnlyList<Bus> Buses { get; }

    public IReadOnlyList<Line> Lines { get; }

    public IReadOnlyList<Generator> Generators { get; }

    /// <summary>Site names in the order in which their first bus appears.</summary>
    public IReadOnlyList<string> Sites { get; }

    /// <summary>Indices of the generators at a bus.</summary>
    public IReadOnlyList<int> GeneratorsAt(int bus) => _generatorsAt[bus];

    /// <summary>Indices of the lines that touch a bus.</summary>
    public IReadOnlyList<int> LinesAt(int bus) => _linesAt[bus];

    /// <summary>Indices of a site's buses, in plan order; empty for an unknown site.</summary>
    public IReadOnlyList<int> BusesOf(string site) => _busesOf.TryGetValue(site, out var buses) ? buses : [];

    /// <summary>Susceptance of a line, MW per radian; negative for a negative reactance.</summary>
    public double SusceptanceMwPerRad(int line) => BaseMva / Lines[line].ReactancePu;

    private int[][] Group(int count, Func<int, int> busOf, string what)
    {
        var lists = new List<int>[Buses.Count];
        for (var i = 0; i < lists.Length; i++)
            lists[i] = [];
        for (var i = 0; i < count; i++)
        {
            if ((uint)busOf(i) >= (uint)lists.Length)
                throw new ArgumentException($"A {what} stands at a bus outside the network.");
            lists[busOf(i)].Add(i);
        }

        return Array.ConvertAll(lists, list => list.ToArray());
    }
}
