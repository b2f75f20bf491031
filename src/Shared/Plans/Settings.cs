namespace Halfvoice.Plans;

/// <summary>How sites and coordinator talk the dispatch out.</summary>
public enum SchemeKind
{
    /// <summary>Consensus on the angles of border buses; areas keep their inner network to themselves.</summary>
    Angle,

    /// <summary>Consensus on net injections; the coordinator knows the network.</summary>
    Injection,
}

/// <summary>Plan key <c>scheme</c>.</summary>
public sealed record SchemeSettings
{
    public SchemeKind Kind { get; init; } = SchemeKind.Injection;

    /// <summary>Plan key <c>penalty</c>: absent or <c>auto</c> is 1; a number multiplies the automatic penalty; above 0, at most 1000.</summary>
    public double PenaltyFactor { get; init; } = 1;

    /// <summary>Over-relaxation, 1 to below 2; absent is the scheme's own default (injection 1.2, angle 1).</summary>
    public double? Relaxation { get; init; }

    /// <summary>Plan key <c>price_scale</c>: the public price scale L, $/MWh, above 0; absent or <c>auto</c> derives it from the plants.</summary>
    public double? PriceScalePerMwh { get; init; }
}

/// <summary>Plan key <c>stop</c>: when a cycle counts as settled.</summary>
public sealed record StopSettings
{
    /// <summary>Mismatch limit as a fraction of the reference load; default 0.005 (0.5 %), above 0 to 1.</summary>
    public double MismatchFraction { get; init; } = 0.005;

    /// <summary>Plan key <c>price</c>: price-move limit, $/MWh; default 0.05, above 0.</summary>
    public double PriceMovePerMwh { get; init; } = 0.05;

    /// <summary>Plan key <c>rounds</c>: hard cap a cycle; default 200, 1 to 100,000.</summary>
    public int RoundCap { get; init; } = 200;

    /// <summary>Plan key <c>reference_load_mw</c>: a public figure for total demand, MW, above 0; absent is half the installed capacity.</summary>
    public double? ReferenceLoadMw { get; init; }
}

public enum MechanismKind
{
    /// <summary>No noise; must be asked for and is announced.</summary>
    None,

    /// <summary>Fresh noise on each answer.</summary>
    PerRound,
}

public enum NoiseKind
{
    /// <summary>Discrete Laplace on the answer lattice.</summary>
    Laplace,
}

/// <summary>The period whose answers together spend at most epsilon.</summary>
public enum PrivacyScope
{
    Round,
    Cycle,
    Day,
    Campaign,
}

/// <summary>Plan key <c>privacy</c>.</summary>
public sealed record PrivacySettings
{
    public MechanismKind Mechanism { get; init; } = MechanismKind.PerRound;

    public NoiseKind Noise { get; init; } = NoiseKind.Laplace;

    /// <summary>The load change (L1, MW) that must stay hidden; default 1, above 0.</summary>
    public double AdjacencyMw { get; init; } = 1;

    /// <summary>Allowance within <see cref="Scope"/>; default 1, above 0, at most 1000.</summary>
    public double Epsilon { get; init; } = 1;

    /// <summary>Plan key <c>delta</c>, 0 to below 1; Laplace noise with basic composition spends none of it.</summary>
    public double Delta { get; init; }

    public PrivacyScope Scope { get; init; } = PrivacyScope.Cycle;

    /// <summary>False where the plan had no <c>privacy</c> section and the default stands.</summary>
    public bool Stated { get; init; }
}

/// <summary>Plan key <c>rounds</c>.</summary>
public sealed record RoundSettings
{
    /// <summary>Time a round waits for answers; default 2 s, 1 ms to 1 h.</summary>
    public TimeSpan Deadline { get; init; } = TimeSpan.FromSeconds(2);

    /// <summary>Fraction of asked sites that must answer afresh for a round to count; default 0.9, above 0 to 1.</summary>
    public double Quorum { get; init; } = 0.9;

    /// <summary>Rounds in a row for which a missing site's last answer may stand in; default 3, 0 to 1000.</summary>
    public int HoldRounds { get; init; } = 3;
}

/// <summary>One link's character; what is absent comes from the profile.</summary>
/// <param name="Profile">Name of a link profile, or null.</param>
/// <param name="RoundTrip">Typical round-trip time.</param>
/// <param name="Jitter">Typical variation of the round trip.</param>
/// <param name="LossFraction">Share of packets lost, 0 to below 1.</param>
/// <param name="RateKbitPerS">Bandwidth, kbit/s, above 0; infinity for no limit.</param>
public sealed record LinkSettings(
    string? Profile,
    TimeSpan RoundTrip,
    TimeSpan Jitter,
    double LossFraction,
    double RateKbitPerS);

/// <summary>Plan key <c>links</c>: the links from each site to the coordinator.</summary>
public sealed record LinkPlan
{
    public LinkSettings Default { get; init; } = LinkProfiles.Local;

    public IReadOnlyDictionary<string, LinkSettings> Sites { get; init; } = new Dictionary<string, LinkSettings>();

    public LinkSettings For(string site) => Sites.TryGetValue(site, out var link) ? link : Default;
}

/// <summary>Plan key <c>accept</c>: the limits that the verdict judges; an absent limit is not judged unless a default is given.</summary>
public sealed record AcceptSettings
{
    /// <summary>Every cycle settles within this; absent is the interval less 60 s, but at least half the interval.</summary>
    public TimeSpan? SettleWithin { get; init; }

    /// <summary>Plan key <c>cost_gap</c>: delivered cost over optimum, less 1, as a fraction; default 0.01.</summary>
    public double CostGapFraction { get; init; } = 0.01;

    /// <summary>Largest reserve used for balancing, MW; absent is not judged.</summary>
    public double? ReserveMw { get; init; }

    /// <summary>Plan key <c>line_loading</c>: largest loading of a line as a fraction of its limit; default 1.</summary>
    public double LineLoadingFraction { get; init; } = 1;

    /// <summary>Largest privacy loss of a site in a day of cycles like these; absent is not judged.</summary>
    public double? EpsilonPerDay { get; init; }
}
