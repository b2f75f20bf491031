using Halfvoice.Grid;
using Halfvoice.Plans;
using Halfvoice.Rig.Runs;

namespace Halfvoice.Tests.Runs;

public class LongestRunTests
{
    [Fact]
    public void A_run_may_take_every_round_of_every_cycle_up_to_its_deadline() =>
        Assert.Equal(30 + 120 + (3 * 20 * 2.05), LongestRun.Of(Plan(3, 20, TimeSpan.FromSeconds(2))).TotalSeconds, 6);

    [Fact]
    public void The_largest_plan_gives_a_time_that_a_timer_can_wait_for()
    {
        var longest = LongestRun.Of(Plan(100_000, 100_000, TimeSpan.FromHours(1)));
        Assert.Equal(LongestRun.Most, longest);
        using var timer = new CancellationTokenSource();
        timer.CancelAfter(longest);
        Assert.False(timer.IsCancellationRequested);
    }

    private static Plan Plan(int cycles, int roundCap, TimeSpan deadline) => new()
    {
        Name = "Small",
        Cycles = cycles,
        Stop = new StopSettings { RoundCap = roundCap },
        Rounds = new RoundSettings { Deadline = deadline },
        Network = new Network(100, [new Bus("A", "north")], [], []),
        Loads = new Dictionary<string, LoadSeries>(),
    };
}
