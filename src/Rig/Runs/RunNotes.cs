using System.Globalization;
using Halfvoice.Plans;

namespace Halfvoice.Rig.Runs;

/// <summary>What a reader of the verdict must know to read its numbers rightly.</summary>
public static class RunNotes
{
    /// <summary>The safety notice in one paragraph.</summary>
    public const string Safety =
        "A rehearsal is no operating instruction and no certification. Set-points reach equipment only through the operator's own licensed "
        + "staff, interlocks and protection, under the local grid code; protection and local limits stay independent of this tool; a zero "
        + "set-point is not isolation. The DC model leaves out voltage, reactive power, losses and stability.";

    public static IReadOnlyList<string> Of(Plan plan, IReadOnlyList<JournalCycle> cycles, string binaries)
    {
        var notes = new List<string>
        {
            Safety,
            binaries,
            "Links: loopback on this machine; the plan's links were not emulated, so real links will be slower.",
            "Not replayable to the byte: real processes, real time, noise from the operating system's generator.",
            PrivacyNote(plan),
        };
        if (plan.Privacy.Mechanism != MechanismKind.None)
        {
            notes.Add("Set-points are corrected by each site for its own true load, so a plant's metered output depends on that load; "
                + "the ε values cover the answers on the wire only.");
        }

        foreach (var cycle in cycles)
        {
            if (cycle.End != "Settled")
            {
                notes.Add($"Cycle {cycle.Cycle} did not settle ({cycle.End}): in the field the last accepted dispatch stands; "
                    + "the scores are of the dispatch that it had reached.");
            }

            if (cycle.UnservedMw > 1e-6)
            {
                notes.Add(string.Create(CultureInfo.InvariantCulture,
                    $"Cycle {cycle.Cycle}: the released values could not all be honoured by the network; "
                    + $"{cycle.UnservedMw:0.###} MW were left unserved in the last consensus."));
            }
        }

        if (cycles.Count < plan.Cycles)
            notes.Add($"Only {cycles.Count} of {plan.Cycles} cycles were finished.");
        return notes;
    }

    /// <summary>Refuses privacy figures that no noise can be derived from, before any process starts.</summary>
    /// <exception cref="RigException">The privacy figures give no usable noise (exit code 2).</exception>
    public static void RefuseUnusablePrivacy(Plan plan)
    {
        try
        {
            var setups = new Coordination.SetupBuilder(plan);
            foreach (var site in plan.Network.Sites)
                Coordination.SitePrivacy.Derive(setups.ForSite(site));
        }
        catch (ArgumentException wrong)
        {
            throw new RigException(ExitCodes.PlanWrong, $"plan.yaml: privacy: {wrong.Message}", wrong);
        }
    }

    /// <summary>The promise in one sentence.</summary>
    public static string PrivacyNote(Plan plan)
    {
        if (plan.Privacy.Mechanism == MechanismKind.None)
            return "Mechanism none: answers are NOT veiled; a listener recovers every load from them.";
        var stated = plan.Privacy.Stated ? "as the plan states" : "the default, since the plan has no privacy section";
        return string.Create(CultureInfo.InvariantCulture,
            $"Mechanism per-round ({stated}): discrete Laplace noise on every answer, "
            + $"load changes of {plan.Privacy.AdjacencyMw} MW hidden, ε {plan.Privacy.Epsilon} per {plan.Privacy.Scope.ToString().ToLowerInvariant()}, "
            + $"δ = 0, basic composition.");
    }
}
