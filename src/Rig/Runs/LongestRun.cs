using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Rig.Runs;

/// <summary>How long a rehearsal may take before it counts as stuck.</summary>
public static class LongestRun
{
    /// <summary>No rehearsal is waited for longer than this; a timer takes 49 days at most.</summary>
    public static readonly TimeSpan Most = TimeSpan.FromDays(45);

    private const double StartSeconds = 120;
    private const double BetweenRoundsSeconds = 0.05;

    /// <summary>Time to start and gather, and every round of every cycle up to its deadline; <see cref="Most"/> where that is more.</summary>
    public static TimeSpan Of(Plan plan)
    {
        var rounds = (double)plan.Cycles * plan.Stop.RoundCap;
        var seconds = CoordinatorCore.GatherSeconds + StartSeconds + (rounds * (plan.Rounds.Deadline.TotalSeconds + BetweenRoundsSeconds));
        return seconds < Most.TotalSeconds ? TimeSpan.FromSeconds(seconds) : Most;
    }
}
