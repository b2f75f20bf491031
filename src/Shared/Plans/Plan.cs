using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>Everything a rehearsal needs, read from a plan folder and validated. Immutable.</summary>
public sealed record Plan
{
    public required string Name { get; init; }

    /// <summary>Length of a dispatch interval; default 5 minutes, 1 s to 24 h.</summary>
    public TimeSpan Interval { get; init; } = TimeSpan.FromMinutes(5);

    /// <summary>Dispatch cycles that a rehearsal runs; default 1, 1 to 100,000.</summary>
    public int Cycles { get; init; } = 1;

    public SchemeSettings Scheme { get; init; } = new();

    public StopSettings Stop { get; init; } = new();

    public PrivacySettings Privacy { get; init; } = new();

    public RoundSettings Rounds { get; init; } = new();

    public LinkPlan Links { get; init; } = new();

    public AcceptSettings Accept { get; init; } = new();

    public required Network Network { get; init; }

    /// <summary>Loads by site; every site has an entry (zeros where no file was given).</summary>
    public required IReadOnlyDictionary<string, LoadSeries> Loads { get; init; }

    /// <summary>Loads of all buses in a cycle (1-based), MW, in the order of <see cref="Network.Buses"/>.</summary>
    public double[] LoadMw(int cycle)
    {
        var load = new double[Network.Buses.Count];
        foreach (var site in Network.Sites)
        {
            var own = Loads[site].At(cycle);
            var buses = Network.BusesOf(site);
            for (var i = 0; i < buses.Count; i++)
                load[buses[i]] = own[i];
        }

        return load;
    }
}
