using Halfvoice.Coordination;
using Halfvoice.Optimization;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>A plan run through both cores without noise and without a network.</summary>
internal sealed class PlainRun
{
    private readonly LocalDispatch _dispatch;

    private PlainRun(Plan plan)
    {
        Plan = plan;
        Setups = new SetupBuilder(plan);
        _dispatch = new LocalDispatch(plan, Setups, _ => new NoNoise());
        _dispatch.Journalled += Journal.Add;
        Cycles = _dispatch.Run();
    }

    public Plan Plan { get; }

    public SetupBuilder Setups { get; }

    public List<JournalEntry> Journal { get; } = [];

    public IReadOnlyList<LocalCycle> Cycles { get; }

    public static PlainRun Of(Plan plan) => new(plan with { Privacy = new PrivacySettings { Mechanism = MechanismKind.None, Stated = true } });

    /// <summary>The plan with limits so tight that the scheme runs on to the optimum.</summary>
    public static Plan Tightened(Plan plan, SchemeKind kind, double mismatchMw, double pricePerMwh, int roundCap, double? relaxation = null) => plan with
    {
        Scheme = new SchemeSettings { Kind = kind, Relaxation = relaxation },
        Stop = new StopSettings
        {
            ReferenceLoadMw = 1,
            MismatchFraction = mismatchMw,
            PriceMovePerMwh = pricePerMwh,
            RoundCap = roundCap,
        },
    };

    public double[] SetPointsMw(int cycle) => _dispatch.SetPointsMw(cycle);

    public Optimum Optimum(int cycle) => CentralOptimum.Solve(Plan.Network, Plan.LoadMw(cycle));

    /// <summary>Cost of the set-points as they stand, $/h.</summary>
    public double CostPerHour(int cycle) =>
        Plan.Network.Generators.Zip(SetPointsMw(cycle)).Sum(pair => pair.First.CostPerHour(pair.Second));
}
