using Halfvoice.Plans;

namespace Halfvoice.Coordination;

/// <summary>
/// What one site is given before it goes live: public plan data about its own corner, and its own plants with their costs.
/// Loads are not in it. Serialised as <c>site.json</c> in the site's bundle.
/// </summary>
public sealed record SiteSetup
{
    public required string Plan { get; init; }

    public required string Site { get; init; }

    /// <summary>HOST:PORT under which the site dials the coordinator; null where the command line says it.</summary>
    public string? Coordinator { get; init; }

    /// <summary>Digest of the public plan data; equal at all sites and the coordinator.</summary>
    public required string SetupDigest { get; init; }

    public required SchemeKind Scheme { get; init; }

    /// <summary>Public price scale L, $/MWh.</summary>
    public required double PriceScalePerMwh { get; init; }

    /// <summary>Public price at which unserved or surplus power is counted, $/MWh.</summary>
    public required double UnservedPricePerMwh { get; init; }

    /// <summary>Dispatch interval, s.</summary>
    public required double IntervalSeconds { get; init; }

    /// <summary>Hard cap of rounds a cycle; bounds what a cycle can spend.</summary>
    public required int RoundCap { get; init; }

    /// <summary>Cycles of the campaign, for the campaign scope.</summary>
    public required int CampaignCycles { get; init; }

    public required PrivacySettings Privacy { get; init; }

    /// <summary>Own buses in plan order.</summary>
    public required IReadOnlyList<SiteBus> Buses { get; init; }

    public required IReadOnlyList<SiteGenerator> Generators { get; init; }

    /// <summary>Lines that touch own buses (scheme angle); empty for injection.</summary>
    public IReadOnlyList<SiteLine> Lines { get; init; } = [];

    /// <summary>Copies that the site answers with (scheme angle); empty for injection.</summary>
    public IReadOnlyList<SiteCopy> Copies { get; init; } = [];
}

/// <summary>An own bus.</summary>
/// <param name="PenaltyPerMw2h">Scheme injection: ρ_b = L / R_b, $/MW²h; 0 where the bus has nothing to adjust.</param>
/// <param name="BoundMw">Public bound on |net injection|, MW.</param>
public sealed record SiteBus(string Name, double PenaltyPerMw2h, double BoundMw);

/// <param name="Bus">Index into the site's own buses.</param>
public sealed record SiteGenerator(
    string Name, int Bus, double MinMw, double MaxMw, double CostQuadratic, double CostLinear, double CostFixed);

/// <summary>A line seen from a site: nodes below the count of own buses are own, others index the foreign nodes after them.</summary>
/// <param name="LimitMw">Largest flow, MW; null for no limit.</param>
public sealed record SiteLine(string Name, int FromNode, int ToNode, double SusceptanceMwPerRad, double? LimitMw);

/// <summary>A copy of a bus angle that the site answers with.</summary>
/// <param name="Bus">Name of the bus, own or foreign.</param>
/// <param name="Node">Local node index (own buses first, then foreign ones in the order of their copies).</param>
/// <param name="WeightPerRad2h">Penalty w_c, $/rad²h.</param>
/// <param name="MwPerRad">Public scale that turns an angle difference at this copy into MW.</param>
public sealed record SiteCopy(string Bus, int Node, double WeightPerRad2h, double MwPerRad);
