using Halfvoice.Plans;

namespace Halfvoice.Coordination;

/// <summary>
/// What the coordinator is given: public data only, no load and no cost. Serialised as <c>coordinator.json</c>.
/// </summary>
public sealed record CoordinatorSetup
{
    public required string Plan { get; init; }

    public required string SetupDigest { get; init; }

    public required SchemeKind Scheme { get; init; }

    public required double BaseMva { get; init; }

    public required double PriceScalePerMwh { get; init; }

    /// <summary>Over-relaxation, 1 to below 2.</summary>
    public required double Relaxation { get; init; }

    public required double IntervalSeconds { get; init; }

    public required int Cycles { get; init; }

    public required int RoundCap { get; init; }

    /// <summary>Mismatch limit, MW (the plan's fraction times the public reference load).</summary>
    public required double MismatchLimitMw { get; init; }

    /// <summary>Price-move limit, $/MWh.</summary>
    public required double PriceMoveLimitPerMwh { get; init; }

    public required double DeadlineSeconds { get; init; }

    public required double Quorum { get; init; }

    public required int HoldRounds { get; init; }

    public required IReadOnlyList<CoordinatorSite> Sites { get; init; }

    /// <summary>Scheme injection: the network. Empty for angle, which needs only the copies.</summary>
    public IReadOnlyList<CoordinatorBus> Buses { get; init; } = [];

    public IReadOnlyList<CoordinatorLine> Lines { get; init; } = [];
}

/// <param name="Name">The site's name, as in its certificate.</param>
/// <param name="Components">Scheme injection: own buses, index into <see cref="CoordinatorSetup.Buses"/>. Angle: its copies.</param>
public sealed record CoordinatorSite(string Name, IReadOnlyList<CoordinatorComponent> Components);

/// <summary>One number of a site's answer.</summary>
/// <param name="Bus">Name of the bus that the number is about.</param>
/// <param name="Penalty">ρ_b ($/MW²h) or w_c ($/rad²h); 0 for a bus that cannot move.</param>
/// <param name="MwPerUnit">1 for injection; for angle the public MW per rad of the copy.</param>
/// <param name="Bound">Public bound on |answer|, MW or rad.</param>
public sealed record CoordinatorComponent(string Bus, double Penalty, double MwPerUnit, double Bound);

public sealed record CoordinatorBus(string Name);

/// <param name="LimitMw">Largest flow, MW; null for no limit.</param>
public sealed record CoordinatorLine(string Name, int FromBus, int ToBus, double ReactancePu, double? LimitMw);
