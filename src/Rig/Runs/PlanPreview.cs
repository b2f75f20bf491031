using System.Globalization;
using Google.Protobuf;
using Halfvoice.Coordination;
using Halfvoice.Optimization;
using Halfvoice.Plans;
using Halfvoice.Privacy;
using Halfvoice.Rehearsal;
using Halfvoice.Wire;

namespace Halfvoice.Rig.Runs;

/// <summary>
/// What a rehearsal of a plan would do, found by a trial of its first cycle in this process: the real cores, no network, and
/// seeded noise that protects nothing (nothing of it leaves).
/// </summary>
public sealed record PlanPreview
{
    private const int FrameBytes = 5;

    public required double PriceScalePerMwh { get; init; }

    public required double ReferenceLoadMw { get; init; }

    public required double MismatchLimitMw { get; init; }

    /// <summary>Central optimum of each distinct cycle, in cycle order.</summary>
    public required IReadOnlyList<Optimum> Optima { get; init; }

    public required CycleEnd TrialEnd { get; init; }

    public required int TrialRounds { get; init; }

    public required RoundMeasure TrialMeasure { get; init; }

    public required DeliveredScore TrialScore { get; init; }

    /// <summary>Bytes of a usual round, all sites, both directions, gRPC framing included.</summary>
    public required double BytesPerRound { get; init; }

    public required string SlowestSite { get; init; }

    public required LinkSettings SlowestLink { get; init; }

    /// <summary>Sites by the way their noise is derived.</summary>
    public required IReadOnlyList<(IReadOnlyList<string> Sites, AnswerDerivation Derivation)> Privacy { get; init; }

    /// <summary>Time that the trial's rounds take at least over the slowest link, s.</summary>
    public double LinkSeconds => TrialRounds * SlowestLink.RoundTrip.TotalSeconds;

    /// <exception cref="RigException">The loads cannot be served, or the privacy figures give no usable noise (exit code 2).</exception>
    public static PlanPreview Of(Plan plan)
    {
        var setups = new SetupBuilder(plan);
        var optima = Enumerable.Range(1, plan.Cycles).Take(MostOptima)
            .Select(c => CentralYardstick.Solve(plan.Network, plan.LoadMw(c), $"cycle {c}")).ToArray();
        var (slowest, link) = plan.Network.Sites.Select(site => (site, plan.Links.For(site))).MaxBy(pair => pair.Item2.RoundTrip + pair.Item2.Jitter);
        var privacy = Derivations(plan, setups);
        var trial = plan with { Cycles = 1 };
        var seed = 0UL;
        var run = new LocalDispatch(trial, new SetupBuilder(trial), _ => new SeededNoiseSource(++seed));
        var traffic = new Traffic();
        run.Journalled += traffic.Count;
        var cycle = run.Run()[0];
        return new PlanPreview
        {
            PriceScalePerMwh = setups.PriceScalePerMwh,
            ReferenceLoadMw = setups.ReferenceLoadMw,
            MismatchLimitMw = setups.Coordinator.MismatchLimitMw,
            Optima = optima,
            TrialEnd = cycle.End,
            TrialRounds = cycle.Rounds,
            TrialMeasure = cycle.Measure,
            TrialScore = DeliveredDispatch.Score(plan.Network, plan.LoadMw(1), run.SetPointsMw(1), optima[0].CostPerHour),
            BytesPerRound = traffic.BytesPerRound,
            SlowestSite = slowest,
            SlowestLink = link,
            Privacy = privacy,
        };
    }

    private const int MostOptima = 24;

    /// <summary>Noise on one answer above this share of the reference load drowns the dispatch.</summary>
    private const double LargeNoiseFraction = 0.02;

    /// <summary>Everything that deserves a second look.</summary>
    public IEnumerable<string> Warnings(Plan plan)
    {
        var network = plan.Network;
        for (var c = 0; c < Optima.Count; c++)
        {
            var full = Enumerable.Range(0, network.Lines.Count).Where(l => Math.Abs(Optima[c].FlowMw[l]) >= 0.999 * network.Lines[l].LimitMw).ToArray();
            if (full.Length > 0)
                yield return $"cycle {c + 1}: at their limit in the optimum: {Names(full.Select(l => network.Lines[l].Name))}";
        }

        foreach (var (site, shortMw) in BorderCheck.Shortfalls(plan))
            yield return FormattableString.Invariant($"site {site} has more load than its plants and border lines can bring in, by {shortMw:0.0} MW");
        if (TrialEnd != CycleEnd.Settled)
            yield return $"the trial of cycle 1 did not settle within {plan.Stop.RoundCap} rounds ({TrialEnd})";
        var within = AcceptanceJudge.SettleWithinSeconds(plan);
        if (LinkSeconds > within)
            yield return FormattableString.Invariant(
                $"{TrialRounds} rounds over the link of {SlowestSite} take {LinkSeconds:0} s or more; the limit is {within:0} s");
        if (SlowestLink.RoundTrip > plan.Rounds.Deadline)
        {
            yield return string.Create(
                CultureInfo.InvariantCulture,
                $"the round trip of {SlowestSite} ({SlowestLink.RoundTrip.TotalMilliseconds:0} ms) is longer than "
                + $"the round deadline ({plan.Rounds.Deadline.TotalMilliseconds:0} ms)");
        }

        if (plan.Privacy.Mechanism == MechanismKind.None)
            yield return "mechanism none: answers are NOT veiled; a listener recovers every load from them";
        foreach (var (sites, derivation) in Privacy)
        {
            if (derivation.Unit == "MW" && derivation.Calibration.Scale > LargeNoiseFraction * ReferenceLoadMw)
            {
                yield return FormattableString.Invariant(
                    $"the noise on one answer of {Names(sites)} has a scale of {derivation.Calibration.Scale:0.##} MW, ")
                    + FormattableString.Invariant($"over {100 * LargeNoiseFraction:0} % of the reference load: ")
                    + "lower stop.rounds or adjacency_mw, or raise epsilon";
            }

            if (derivation.Allowance.EpsilonPerCycle > 10)
            {
                yield return $"ε {derivation.Allowance.EpsilonPerCycle:0.###} a cycle at {Names(sites)} promises next to nothing: "
                    + "common practice is at most 10, better 1";
            }

            if (derivation.DayTotal > 10 && derivation.Allowance.EpsilonPerCycle <= 10)
            {
                yield return $"a day of such cycles adds up to ε {derivation.DayTotal:0.###} at {Names(sites)}: "
                    + $"the promise holds per {plan.Privacy.Scope.ToString().ToLowerInvariant()}, hardly per day";
            }
        }
    }

    private static IReadOnlyList<(IReadOnlyList<string> Sites, AnswerDerivation Derivation)> Derivations(Plan plan, SetupBuilder setups)
    {
        try
        {
            return plan.Network.Sites.Select(site => (site, Derivation: SitePrivacy.Derive(setups.ForSite(site))))
                .Where(pair => pair.Derivation is not null)
                .GroupBy(pair => pair.Derivation!.Words)
                .Select(group => ((IReadOnlyList<string>)group.Select(pair => pair.site).ToArray(), group.First().Derivation!))
                .ToArray();
        }
        catch (ArgumentException wrong)
        {
            throw new RigException(ExitCodes.PlanWrong, $"plan.yaml: privacy: {wrong.Message}", wrong);
        }
    }

    private static string Names(IEnumerable<string> names)
    {
        var all = names.ToArray();
        return string.Join(", ", all.Take(6)) + (all.Length > 6 ? $" and {all.Length - 6} more" : string.Empty);
    }

    /// <summary>Sizes of the messages of the trial's last round, as they would be on the wire.</summary>
    private sealed class Traffic
    {
        private long _asked;

        public double BytesPerRound { get; private set; }

        public void Count(JournalEntry entry)
        {
            if (entry is JournalEntry.RoundAsked asked)
            {
                var wire = new SiteWire();
                _asked = asked.Asks.Sum(pair => Size(wire.Write(new CoordinatorMessage.Asked(pair.Ask))));
            }
            else if (entry is JournalEntry.RoundClosed closed)
            {
                var wire = new CoordinatorWire();
                BytesPerRound = _asked + closed.Answers.Sum(pair => Size(wire.WriteAnswer(pair.Answer)));
            }
        }

        private static long Size(IMessage message) => message.CalculateSize() + FrameBytes;
    }
}
