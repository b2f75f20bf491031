using System.Globalization;
using System.Security.Cryptography;
using System.Text;
using Halfvoice.Grid;
using Halfvoice.Plans;

namespace Halfvoice.Coordination;

/// <summary>Divides a plan into what the coordinator may know and what each site gets.</summary>
public sealed class SetupBuilder
{
    /// <summary>Unserved or surplus power is counted at this many times the price scale.</summary>
    public const double UnservedPriceFactor = 10;

    /// <summary>Public bound on an angle copy, rad: far beyond any real angle, close enough for a fine lattice.</summary>
    public const double AngleBoundRad = 32;

    /// <summary>Default over-relaxation of scheme injection.</summary>
    public const double InjectionRelaxation = 1.2;

    /// <summary>Default over-relaxation of scheme angle.</summary>
    public const double AngleRelaxation = 1;

    private readonly Plan _plan;
    private readonly Network _network;
    private readonly double[] _penalty;
    private readonly AngleWeights? _weights;
    private readonly double _injectionBoundMw;

    public SetupBuilder(Plan plan)
    {
        _plan = plan;
        _network = plan.Network;
        PriceScalePerMwh = plan.Scheme.PriceScalePerMwh ?? PriceScale.Of(_network.Generators);
        _penalty = InjectionPenalty.Of(_network, PriceScalePerMwh, plan.Scheme.PenaltyFactor);
        _weights = plan.Scheme.Kind == SchemeKind.Angle
            ? new AngleWeights(_network, PriceScalePerMwh, plan.Scheme.PenaltyFactor)
            : null;
        _injectionBoundMw = 2 * Math.Max(1, _network.Generators.Sum(g => Math.Max(Math.Abs(g.MinMw), Math.Abs(g.MaxMw))));
        Coordinator = BuildCoordinator();
    }

    /// <summary>L, $/MWh.</summary>
    public double PriceScalePerMwh { get; }

    public CoordinatorSetup Coordinator { get; }

    /// <summary>The public figure for total demand that the mismatch limit is a share of, MW.</summary>
    public double ReferenceLoadMw => _plan.Stop.ReferenceLoadMw ?? Math.Max(1, 0.5 * _network.Generators.Sum(g => Math.Max(0, g.MaxMw)));

    /// <summary>The setup of one site.</summary>
    /// <exception cref="ArgumentException">The plan has no such site.</exception>
    public SiteSetup ForSite(string site)
    {
        var own = _network.BusesOf(site);
        if (own.Count == 0)
            throw new ArgumentException($"The plan has no site '{site}'.", nameof(site));
        var corner = SiteCorner.Of(_network, site);
        return new SiteSetup
        {
            Plan = _plan.Name,
            Site = site,
            SetupDigest = Coordinator.SetupDigest,
            Scheme = _plan.Scheme.Kind,
            PriceScalePerMwh = PriceScalePerMwh,
            UnservedPricePerMwh = UnservedPriceFactor * PriceScalePerMwh,
            IntervalSeconds = _plan.Interval.TotalSeconds,
            RoundCap = _plan.Stop.RoundCap,
            CampaignCycles = _plan.Cycles,
            Privacy = _plan.Privacy,
            Buses = own.Select(bus => new SiteBus(_network.Buses[bus].Name, _penalty[bus], _injectionBoundMw)).ToArray(),
            Generators = own.SelectMany((bus, local) => _network.GeneratorsAt(bus).Select(g => Local(_network.Generators[g], local))).ToArray(),
            Lines = _weights is null ? [] : corner.Lines,
            Copies = _weights?.CopiesOf(corner) ?? [],
        };
    }

    private static SiteGenerator Local(Generator g, int bus) =>
        new(g.Name, bus, g.MinMw, g.MaxMw, g.CostQuadratic, g.CostLinear, g.CostFixed);

    private CoordinatorSetup BuildCoordinator()
    {
        var injection = _plan.Scheme.Kind == SchemeKind.Injection;
        var setup = new CoordinatorSetup
        {
            Plan = _plan.Name,
            SetupDigest = string.Empty,
            Scheme = _plan.Scheme.Kind,
            BaseMva = _network.BaseMva,
            PriceScalePerMwh = PriceScalePerMwh,
            Relaxation = _plan.Scheme.Relaxation ?? (injection ? InjectionRelaxation : AngleRelaxation),
            IntervalSeconds = _plan.Interval.TotalSeconds,
            Cycles = _plan.Cycles,
            RoundCap = _plan.Stop.RoundCap,
            MismatchLimitMw = _plan.Stop.MismatchFraction * ReferenceLoadMw,
            PriceMoveLimitPerMwh = _plan.Stop.PriceMovePerMwh,
            DeadlineSeconds = _plan.Rounds.Deadline.TotalSeconds,
            Quorum = _plan.Rounds.Quorum,
            HoldRounds = _plan.Rounds.HoldRounds,
            Sites = _network.Sites.Select(site => new CoordinatorSite(site, ComponentsOf(site))).ToArray(),
            Buses = injection ? _network.Buses.Select(bus => new CoordinatorBus(bus.Name)).ToArray() : [],
            Lines = injection ? _network.Lines.Select(Public).ToArray() : [],
        };
        return setup with { SetupDigest = Digest(setup, injection ? [] : TieLines()) };
    }

    private CoordinatorComponent[] ComponentsOf(string site) => _weights is { } weights
        ? weights.CopiesOf(SiteCorner.Of(_network, site))
            .Select(copy => new CoordinatorComponent(copy.Bus, copy.WeightPerRad2h, copy.MwPerRad, AngleBoundRad)).ToArray()
        : _network.BusesOf(site)
            .Select(bus => new CoordinatorComponent(_network.Buses[bus].Name, _penalty[bus], 1, _injectionBoundMw)).ToArray();

    private static CoordinatorLine Public(Line line) =>
        new(line.Name, line.FromBus, line.ToBus, line.ReactancePu, double.IsFinite(line.LimitMw) ? line.LimitMw : null);

    /// <summary>The lines between sites; under scheme angle the sites at both ends hold them and must hold the same.</summary>
    private IEnumerable<Line> TieLines() =>
        _network.Lines.Where(line => _network.Buses[line.FromBus].Site != _network.Buses[line.ToBus].Site);

    /// <summary>SHA-256 over the public numbers that both ends must agree on.</summary>
    private static string Digest(CoordinatorSetup setup, IEnumerable<Line> tieLines)
    {
        var text = new StringBuilder();
        text.Append(CultureInfo.InvariantCulture, $"{setup.Plan}|{setup.Scheme}|{setup.BaseMva:R}|");
        text.Append(CultureInfo.InvariantCulture, $"{setup.PriceScalePerMwh:R}|{setup.RoundCap}|{setup.Cycles}\n");
        foreach (var site in setup.Sites)
        {
            text.Append(site.Name).Append('\n');
            foreach (var part in site.Components)
                text.Append(CultureInfo.InvariantCulture, $"{part.Bus}|{part.Penalty:R}|{part.Bound:R}\n");
        }

        foreach (var line in tieLines)
            text.Append(CultureInfo.InvariantCulture, $"{line.Name}|{line.ReactancePu:R}|{line.LimitMw:R}\n");
        return Convert.ToHexStringLower(SHA256.HashData(Encoding.UTF8.GetBytes(text.ToString())));
    }
}
