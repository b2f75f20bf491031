using Halfvoice.Plans;
using Halfvoice.Privacy;

namespace Halfvoice.Coordination;

/// <summary>A site's privacy in one place: what is promised, how the noise follows from it, and the release itself.</summary>
public sealed class SitePrivacy
{
    private readonly IAnswerMechanism _mechanism;
    private readonly IReadOnlyList<int> _adjustable;
    private readonly long[] _steps;

    /// <exception cref="ArgumentException">The plan's figures give no usable noise scale; the text says which to change.</exception>
    public SitePrivacy(SiteSetup setup, ISiteScheme scheme, INoiseSource noise)
    {
        _adjustable = scheme.Adjustable;
        _steps = new long[scheme.ComponentCount];
        var bounds = AnswerBounds.Symmetric(Math.Max(1, scheme.ComponentCount), scheme.Bound);
        Derivation = Derive(setup, scheme, bounds);
        _mechanism = Derivation is { } derivation
            ? new PerRoundMechanism(derivation.Calibration, bounds, noise)
            : new NoNoiseMechanism(setup.Scheme == SchemeKind.Injection ? AnswerLattice.NoiselessMw : AnswerLattice.NoiselessRad, bounds);
    }

    /// <summary>How the noise follows from the plan; null without noise.</summary>
    public AnswerDerivation? Derivation { get; }

    /// <summary>What may be spent; null where nothing is promised.</summary>
    public ScopeAllowance? Allowance => Derivation?.Allowance;

    public AnswerLattice Lattice => _mechanism.Lattice;

    /// <summary>Scale of the noise on one component, MW or rad; 0 without noise.</summary>
    public double NoiseScale => Derivation?.Calibration.Scale ?? 0;

    /// <summary>What one answer is charged; 0 without noise.</summary>
    public double EpsilonPerAnswer => (double)(Allowance?.EpsilonPerAnswer ?? 0);

    /// <summary>The derivation of a site's noise from public figures alone; null for mechanism <c>none</c>.</summary>
    public static AnswerDerivation? Derive(SiteSetup setup)
    {
        var scheme = SiteSchemes.Create(setup);
        return Derive(setup, scheme, AnswerBounds.Symmetric(Math.Max(1, scheme.ComponentCount), scheme.Bound));
    }

    /// <summary>Draws the noise of the next answer, before its ask arrives.</summary>
    public void PrepareNoise() => _mechanism.PrepareNoise(1);

    /// <summary>
    /// Releases an answer. All components are veiled in one release of full dimension; what was not asked for is then
    /// dropped, which is post-processing.
    /// </summary>
    public long[] Release(ReadOnlySpan<double> values, bool everything)
    {
        if (values.Length == 0)
            return [];
        if (_mechanism.Prepared < 1)
            _mechanism.PrepareNoise(1);
        _mechanism.Release(values, _steps);
        var released = everything ? _steps.ToArray() : _adjustable.Select(k => _steps[k]).ToArray();
        Array.Clear(_steps);
        return released;
    }

    private static AnswerDerivation? Derive(SiteSetup setup, ISiteScheme scheme, AnswerBounds bounds)
    {
        if (setup.Privacy.Mechanism == MechanismKind.None)
            return null;
        var allowance = ScopeAllowance.For(setup.Privacy, setup.RoundCap, TimeSpan.FromSeconds(setup.IntervalSeconds),
            setup.CampaignCycles, scheme.Adjustable.Count == 0);
        var injection = setup.Scheme == SchemeKind.Injection;
        var sensitivity = injection
            ? InjectionSensitivity.For(setup.Privacy.AdjacencyMw)
            : AngleSensitivity.For(ShapeOf(setup), setup.Privacy.AdjacencyMw);
        return AnswerDerivation.For(setup.Privacy, allowance, sensitivity, bounds, injection ? "MW" : "rad");
    }

    private static AngleSiteShape ShapeOf(SiteSetup setup)
    {
        var nodes = Math.Max(setup.Buses.Count, setup.Copies.Count == 0 ? 0 : setup.Copies.Max(copy => copy.Node) + 1);
        var weights = new double[nodes];
        foreach (var copy in setup.Copies)
            weights[copy.Node] = copy.WeightPerRad2h;
        var lines = setup.Lines
            .Select(line => new AngleSiteLine(line.FromNode, line.ToNode, line.SusceptanceMwPerRad, line.LimitMw is not null))
            .ToArray();
        return new AngleSiteShape(setup.Buses.Count, weights, lines, setup.UnservedPricePerMwh);
    }
}
