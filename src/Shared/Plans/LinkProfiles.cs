namespace Halfvoice.Plans;

/// <summary>
/// Named link kinds. Every value is typical and unverified: a starting point to be replaced by measured percentiles.
/// </summary>
public static class LinkProfiles
{
    /// <summary>No network to speak of: both ends on one machine.</summary>
    public static readonly LinkSettings Local = Of("local", 0.2, 0.1, 0, double.PositiveInfinity);

    /// <summary>All profiles by name.</summary>
    public static readonly IReadOnlyDictionary<string, LinkSettings> ByName = new[]
    {
        Local,
        Of("fibre", 8, 0.5, 0.00001, 100_000),
        Of("microwave", 12, 2, 0.0001, 50_000),
        Of("lte", 80, 30, 0.005, 5_000),
        Of("lte-m", 250, 100, 0.01, 700),
        Of("nb-iot", 3_000, 1_500, 0.02, 40),
        Of("leo-satellite", 50, 20, 0.005, 50_000),
        Of("geo-satellite", 600, 60, 0.01, 2_000),
        Of("narrowband-plc", 2_000, 1_000, 0.05, 30),
        Of("uhf-radio", 500, 100, 0.005, 14),
    }.ToDictionary(link => link.Profile!, StringComparer.Ordinal);

    private static LinkSettings Of(string name, double roundTripMs, double jitterMs, double loss, double rateKbitPerS) =>
        new(name, TimeSpan.FromMilliseconds(roundTripMs), TimeSpan.FromMilliseconds(jitterMs), loss, rateKbitPerS);
}
