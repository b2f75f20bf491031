using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>Settings that an invented plan starts from: noisy, bounded, and within reach of a healthy run.</summary>
internal static class InventedSettings
{
    private const double AdjacencyMw = 0.1;

    /// <summary>Scale of the Laplace noise on one answer that the allowance is chosen for, MW.</summary>
    private const double NoiseScaleMw = 1;

    private const double CyclesPerDay = 288;

    public static Plan Around(string name, Network network, IReadOnlyDictionary<string, LoadSeries> loads, double loadMw)
    {
        var rounds = network.Sites.Count <= 50 ? 40 : 60;

        // Basic composition gives each of n rounds ε/n, and Laplace noise at ε/n has scale adjacency · n / ε.
        var epsilon = Math.Round(AdjacencyMw * rounds / NoiseScaleMw, 3);

        // A sum of N independent Laplace draws has standard deviation √(2N) · scale; four of them are rarely passed.
        var noiseMw = 4 * NoiseScaleMw * Math.Sqrt(2.0 * network.Sites.Count);
        return new Plan
        {
            Name = name,
            Cycles = 3,
            Stop = new StopSettings
            {
                MismatchFraction = 0.02,
                PriceMovePerMwh = 0.5,
                RoundCap = rounds,
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
