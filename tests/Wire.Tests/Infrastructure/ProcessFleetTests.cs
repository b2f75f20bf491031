using Halfvoice.Rig.Processes;

namespace Halfvoice.Tests.Infrastructure;

public class ProcessFleetTests
{
    private const int RigChildren = 20;

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Fact]
    public async Task Disposing_of_a_fleet_leaves_none_of_its_children_also_no_paused_one()
    {
        using var witness = new Witness();
        await using (var fleet = new ProcessFleet(killOnSignals: false))
        {
            var children = await StartAsync(fleet, witness, 6);
            children[0].Pause();
            children[1].Pause();
            Assert.Equal(6, fleet.Running.Count);
        }

        await GoneAsync(witness);
    }

    [Fact]
    public async Task Cancelling_the_token_kills_the_children_and_nothing_starts_afterwards()
    {
        using var witness = new Witness();
        using var stop = CancellationTokenSource.CreateLinkedTokenSource(Cancel);
        await using var fleet = new ProcessFleet(killOnSignals: false, stop.Token);
        await StartAsync(fleet, witness, 3);

        await stop.CancelAsync();

        await GoneAsync(witness);
        var failure = Assert.Throws<InvalidOperationException>(() => fleet.Start(Children.Play("late")));
        Assert.Contains("closed", failure.Message);
    }

    [Fact]
    public async Task Stopping_all_asks_and_waits_for_clean_stops_also_of_paused_children()
    {
        await using var fleet = new ProcessFleet(killOnSignals: false);
        await fleet.StartAllAsync(
            [Children.Play("runs"), Children.Play("is paused")], Children.IsReady, Children.Patience, cancel: Cancel);
        fleet.Find("is paused")!.Pause();

        var exits = await fleet.StopAllAsync(Children.Patience);

        Assert.Equal([Children.CleanStop, Children.CleanStop], exits.Select(exit => exit.ExitCode));
    }

    [Fact]
    public async Task Stopping_all_kills_who_does_not_listen()
    {
        await using var fleet = new ProcessFleet(killOnSignals: false);
        var children = await fleet.StartAllAsync(
            [Children.Play("deaf", "deaf"), Children.Play("deaf and paused", "deaf")], Children.IsReady, Children.Patience, cancel: Cancel);
        children[1].Pause();

        var exits = await fleet.StopAllAsync(TimeSpan.FromMilliseconds(50));

        Assert.Equal([128 + 9, 128 + 9], exits.Select(exit => exit.ExitCode));
    }

    [Fact]
    public async Task A_child_that_does_not_get_ready_in_time_is_killed()
    {
        await using var fleet = new ProcessFleet(killOnSignals: false);

        await Assert.ThrowsAsync<ChildFailedException>(() => fleet.StartReadyAsync(
            Children.Play("silent"), _ => false, TimeSpan.FromMilliseconds(100), Cancel));

        await Task.WhenAll(fleet.Running.Select(child => child.Exited)).WaitAsync(Children.Patience, Cancel);
    }

    [Fact]
    public async Task A_child_that_dies_unexpectedly_is_reported_with_exit_code_and_last_words_and_its_name_is_free_again()
    {
        await using var fleet = new ProcessFleet(killOnSignals: false);
        fleet.Start(Children.Play("port", "cry=the disk is full", "exit=9"));

        var exit = await fleet.UnexpectedExits.ReadAsync(Cancel).AsTask().WaitAsync(Children.Patience, Cancel);

        Assert.Equal(("port", 9, false), (exit.Name, exit.ExitCode, exit.WasExpected));
        Assert.Equal(["the disk is full"], exit.LastErrorLines);
        Assert.Null(fleet.Find("port"));
        var (again, _) = await fleet.StartReadyAsync(Children.Play("port"), Children.IsReady, Children.Patience, Cancel);
        Assert.Same(again, fleet.Find("port"));
    }

    [Fact]
    public async Task A_child_that_we_killed_or_expected_to_go_is_not_reported()
    {
        var fleet = new ProcessFleet(killOnSignals: false);
        var children = await fleet.StartAllAsync(
            [Children.Play("killed"), Children.Play("stopped"), Children.Play("cut")], Children.IsReady, Children.Patience, cancel: Cancel);

        children[0].Kill();
        await children[1].StopAsync(Children.Patience);
        children[2].ExpectExit();
        children[2].CutLifeline();
        await Task.WhenAll(children.Select(child => child.Exited)).WaitAsync(Children.Patience, Cancel);
        await fleet.DisposeAsync();

        await foreach (var exit in fleet.UnexpectedExits.ReadAllAsync(Cancel))
            Assert.Fail($"Reported: {exit}");
    }

    [Fact]
    public async Task A_name_is_taken_only_once_among_the_living()
    {
        await using var fleet = new ProcessFleet(killOnSignals: false);
        fleet.Start(Children.Play("port"));

        var failure = Assert.Throws<InvalidOperationException>(() => fleet.Start(Children.Play("port")));

        Assert.Contains("port", failure.Message);
    }

    [Fact]
    public async Task When_one_of_many_does_not_get_ready_starting_fails_with_its_last_words()
    {
        await using var fleet = new ProcessFleet(killOnSignals: false);
        var starts = Enumerable.Range(0, 5)
            .Select(number => number == 3 ? Children.Play("3", "cry=no certificate", "exit=4") : Children.Play($"{number}"))
            .ToList();

        var failure = await Assert.ThrowsAsync<ChildFailedException>(
            () => fleet.StartAllAsync(starts, Children.IsReady, Children.Patience, atOnce: 2, Cancel));

        Assert.Equal("3", failure.Exit?.Name);
        Assert.Contains("no certificate", failure.Message);
    }

    [Theory]
    [InlineData("running")]
    [InlineData("paused")]
    [InlineData("hang")]
    public async Task A_rig_killed_without_warning_leaves_no_child_behind(string state)
    {
        Assert.SkipUnless(OperatingSystem.IsLinux(), "Only Linux resumes a paused child when its starter dies.");
        using var witness = new Witness();
        string[] options = state == "running" ? [] : [state];
        await using var rig = await StartRigAsync(witness, options);

        rig.Kill();

        await GoneAsync(witness);
    }

    [Fact]
    public async Task A_rig_that_is_asked_to_terminate_leaves_no_child_behind()
    {
        Assert.SkipWhen(OperatingSystem.IsWindows(), "There is no SIGTERM here.");
        using var witness = new Witness();
        await using var rig = await StartRigAsync(witness, "deaf", "paused");

        var exit = await rig.StopAsync(Children.Patience);

        await GoneAsync(witness);
        Assert.Equal(128 + 15, exit.ExitCode);
    }

    [Fact]
    public async Task No_child_inherits_a_pipe_of_its_sibling()
    {
        Assert.SkipUnless(OperatingSystem.IsLinux(), "Reads open files from /proc.");
        await using var fleet = new ProcessFleet(killOnSignals: false);
        var starts = Enumerable.Range(0, 8).Select(number => Children.Play($"{number}")).ToList();
        var children = await fleet.StartAllAsync(starts, Children.IsReady, Children.Patience, atOnce: 8, Cancel);

        // A lifeline's pipe may be open in two processes only: in its child, for reading, and in ours.
        var pipesOf = children.Select(child => OpenPipes(child.ProcessId)).ToList();
        foreach (var (child, index) in children.Select((child, index) => (child, index)))
        {
            var lifeline = new FileInfo($"/proc/{child.ProcessId}/fd/0").LinkTarget;
            Assert.StartsWith("pipe:", lifeline);
            Assert.All(pipesOf.Where((_, other) => other != index), pipes => Assert.DoesNotContain(lifeline, pipes));
        }
    }

    [Fact]
    public async Task An_idle_fleet_costs_no_thread_for_each_child()
    {
        Assert.SkipUnless(OperatingSystem.IsLinux(), "Reads threads from /proc.");
        await using var fleet = new ProcessFleet(killOnSignals: false);
        var before = ThreadCount();
        var starts = Enumerable.Range(0, 30).Select(number => Children.Play($"{number}")).ToList();
        await fleet.StartAllAsync(starts, Children.IsReady, Children.Patience, cancel: Cancel);

        // Two pipes are read for each of 30 children; blocking reads would need 60 threads.
        Assert.InRange(ThreadCount() - before, int.MinValue, 30);
    }

    private static int ThreadCount() => Directory.GetDirectories("/proc/self/task").Length;

    private static HashSet<string?> OpenPipes(int processId) =>
        [.. Directory.GetFiles($"/proc/{processId}/fd").Select(path => new FileInfo(path).LinkTarget)];

    private static async Task<IReadOnlyList<ChildProcess>> StartAsync(ProcessFleet fleet, Witness witness, int count)
    {
        var starts = Enumerable.Range(0, count).Select(number => Children.Play($"{number}", $"witness={witness.Path}")).ToList();
        var children = await fleet.StartAllAsync(starts, Children.IsReady, Children.Patience, cancel: Cancel);
        await witness.MeetAsync(count, Cancel).WaitAsync(Children.Patience, Cancel);
        return children;
    }

    private static async Task<ChildProcess> StartRigAsync(Witness witness, params string[] options)
    {
        var rig = ChildProcess.Start(new ChildStart(
            "rig", Children.Executable, ["parent", $"{RigChildren}", witness.Path, .. options]));
        await rig.WaitForLineAsync(Children.IsReady, Children.Patience, Cancel);
        await witness.MeetAsync(RigChildren, Cancel).WaitAsync(Children.Patience, Cancel);
        Assert.False(witness.SomeoneIsGone);
        return rig;
    }

    private static Task GoneAsync(Witness witness) => witness.AllGoneAsync(Cancel).WaitAsync(Children.Patience, Cancel);
}
