using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>Settings that an invented plan starts from: noisy, bounded, and within reach of a healthy run.</summary>
internal static class InventedSettings
{
    private const double AdjacencyMw = 0.1;

    /// <summary>Scale of the Laplace noise on one answer that the allowance is chosen for, MW.</summary>
    private const double NoiseScaleMw = 1;

    private const double CyclesPerDay = 288;

    /// <summary>Trials of up to 2,000 sites settled within 21 rounds; every round more takes its share of the allowance.</summary>
    private const int RoundCap = 30;

    public static Plan Around(string name, Network network, IReadOnlyDictionary<string, LoadSeries> loads, double loadMw)
    {
        // Basic composition gives each of the cap's n rounds ε/n, and Laplace noise at ε/n has scale adjacency · n / ε.
        var epsilon = Math.Round(AdjacencyMw * RoundCap / NoiseScaleMw, 3);

        // A sum of N independent Laplace draws has standard deviation √(2N) · scale; four of them are rarely passed.
        var noiseMw = 4 * NoiseScaleMw * Math.Sqrt(2.0 * network.Sites.Count);
        return new Plan
        {
            Name = name,
            Cycles = 3,
            Stop = new StopSettings
            {
                MismatchFraction = 0.01,
                PriceMovePerMwh = 0.5,
                RoundCap = RoundCap,
                ReferenceLoadMw = 10 * Math.Ceiling(loadMw / 10),
            },
            Privacy = new PrivacySettings { AdjacencyMw = AdjacencyMw, Epsilon = epsilon, Stated = true },
            Links = new LinkPlan { Default = LinkProfiles.ByName["lte"] },
            Accept = new AcceptSettings
            {
                SettleWithin = TimeSpan.FromSeconds(180),
                CostGapFraction = 0.03,
                ReserveMw = 5 * Math.Ceiling(((0.02 * loadMw) + noiseMw) / 5),
                LineLoadingFraction = 1.15,
                EpsilonPerDay = Math.Ceiling(epsilon * CyclesPerDay),
            },
            Network = network,
            Loads = loads,
        };
    }
}
