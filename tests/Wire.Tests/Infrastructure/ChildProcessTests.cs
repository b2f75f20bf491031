using Halfvoice.Hosting;
using Halfvoice.Rig.Processes;

namespace Halfvoice.Tests.Infrastructure;

public class ChildProcessTests
{
    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Fact]
    public async Task A_child_says_that_it_is_ready_and_stops_cleanly_when_asked()
    {
        await using var child = await Children.StartReadyAsync(Children.Play("one"), Cancel);

        var exit = await child.StopAsync(Children.Patience);

        Assert.Equal(Children.CleanStop, exit.ExitCode);
        Assert.True(exit.WasExpected);
        Assert.Null(exit.OutputFailure);
    }

    [Fact]
    public async Task A_child_that_ignores_the_request_is_killed_after_the_grace()
    {
        await using var child = await Children.StartReadyAsync(Children.Play("deaf", "deaf"), Cancel);

        var exit = await child.StopAsync(TimeSpan.FromMilliseconds(50));

        Assert.Equal(128 + 9, exit.ExitCode);
    }

    [Fact]
    public async Task A_paused_child_still_stops_cleanly()
    {
        await using var child = await Children.StartReadyAsync(Children.Play("paused"), Cancel);
        Assert.True(child.Pause());

        var exit = await child.StopAsync(Children.Patience);

        Assert.Equal(Children.CleanStop, exit.ExitCode);
    }

    [Fact]
    public async Task Stopping_and_killing_a_child_that_is_gone_does_nothing_and_does_not_hide_how_it_went()
    {
        await using var child = ChildProcess.Start(Children.Play("short", "cry=I am leaving", "exit=3"));
        var first = await child.Exited.WaitAsync(Children.Patience, Cancel);

        child.Kill();
        child.Pause();
        child.Resume();
        var again = await child.StopAsync(TimeSpan.Zero);

        Assert.Same(first, again);
        Assert.Equal(3, again.ExitCode);
        Assert.False(again.WasExpected);
        Assert.Equal(["I am leaving"], again.LastErrorLines);
    }

    [Fact]
    public async Task Cutting_the_lifeline_of_a_child_that_never_stops_ends_it_with_the_documented_code()
    {
        await using var child = await Children.StartReadyAsync(Children.Play("hangs", "hang"), Cancel);

        child.CutLifeline();
        var exit = await child.Exited.WaitAsync(Children.Patience, Cancel);

        Assert.Equal(Lifeline.CutExitCode, exit.ExitCode);
    }

    [Fact]
    public async Task Cutting_the_lifeline_first_asks_for_a_clean_stop()
    {
        await using var child = await Children.StartReadyAsync(Children.Play("obeys"), Cancel);

        child.CutLifeline();
        var exit = await child.Exited.WaitAsync(Children.Patience, Cancel);

        Assert.Equal(Children.CleanStop, exit.ExitCode);
    }

    [Fact]
    public async Task A_process_whose_starter_promised_no_lifeline_does_not_watch_its_standard_input()
    {
        var start = Children.Play("free") with { Environment = new Dictionary<string, string?> { [Lifeline.Variable] = null } };
        await using var child = ChildProcess.Start(start);
        var ready = await child.WaitForLineAsync(Children.IsReady, Children.Patience, Cancel);

        Assert.Contains("\"lifeline\":false", ready);
        child.CutLifeline();
        var exit = await child.StopAsync(Children.Patience);
        Assert.Equal(Children.CleanStop, exit.ExitCode);
    }

    [Fact]
    public async Task Environment_and_lines_pass_unchanged_and_in_order()
    {
        var seen = new List<string>();
        var start = Children.Play("talks", "environment=HALFVOICE_TEST", "say=naïve ≤ 5 MW", "lines=500") with
        {
            Environment = new Dictionary<string, string?> { ["HALFVOICE_TEST"] = "a b 'c'" },
            OnLine = seen.Add,
        };
        await using var child = await Children.StartReadyAsync(start, Cancel);
        await child.StopAsync(Children.Patience);

        Assert.Equal(["a b 'c'", "naïve ≤ 5 MW", .. Enumerable.Range(0, 500).Select(number => $"{number}")], seen.Take(502));
    }

    [Fact]
    public async Task Lines_that_nobody_reads_are_dropped_and_counted_and_never_block_the_child()
    {
        var ready = new TaskCompletionSource();
        var start = Children.Play("floods", "lines=20000") with
        {
            LineCapacity = 10,
            OnLine = line =>
            {
                if (Children.IsReady(line))
                    ready.SetResult();
            },
        };
        await using var child = ChildProcess.Start(start);
        await ready.Task.WaitAsync(Children.Patience, Cancel);
        await child.StopAsync(Children.Patience);

        var kept = new List<string>();
        await foreach (var line in child.Lines.ReadAllAsync(Cancel))
            kept.Add(line);

        Assert.Equal(10, kept.Count);
        Assert.Equal(20_001 - 10, child.DroppedLines);
    }

    [Fact]
    public async Task A_line_without_end_is_cut_at_its_longest_length()
    {
        await using var child = ChildProcess.Start(Children.Play("wide", "wide=1000000"));

        var line = await child.WaitForLineAsync(_ => true, Children.Patience, Cancel);
        await child.WaitForLineAsync(Children.IsReady, Children.Patience, Cancel);

        Assert.Equal(64 << 10, line.Length);
    }

    [Fact]
    public async Task Standard_error_goes_to_the_log_up_to_its_limit_and_its_last_lines_are_kept()
    {
        using var folder = new TestFolder();
        var cries = Enumerable.Range(0, 30).Select(number => $"cry=cry number {number:00}").ToArray();
        var start = Children.Play("cries", [.. cries, "exit=1"]) with
        {
            ErrorLogPath = folder.File("logs/cries.txt"),
            ErrorLogLimitBytes = 100,
        };
        await using var child = ChildProcess.Start(start);

        var exit = await child.Exited.WaitAsync(Children.Patience, Cancel);

        Assert.Equal(Enumerable.Range(10, 20).Select(number => $"cry number {number:00}"), exit.LastErrorLines);
        var log = await File.ReadAllLinesAsync(folder.File("logs/cries.txt"), Cancel);
        Assert.Equal(Enumerable.Range(0, 7).Select(number => $"cry number {number:00}"), log[..^1]);
        Assert.Contains("limit", log[^1]);
    }

    [Fact]
    public async Task A_failing_line_handler_is_reported_with_the_exit_and_does_not_block_the_child()
    {
        var start = Children.Play("unheard", "lines=20000", "exit=0") with { OnLine = _ => throw new FormatException("no sense in that") };
        await using var child = ChildProcess.Start(start);

        var exit = await child.Exited.WaitAsync(Children.Patience, Cancel);

        Assert.Equal(0, exit.ExitCode);
        Assert.IsType<FormatException>(exit.OutputFailure);
    }

    [Fact]
    public void A_missing_executable_is_named()
    {
        var failure = Assert.Throws<ChildFailedException>(() => ChildProcess.Start(new ChildStart("ghost", "no-such-program", [])));

        Assert.Contains("ghost", failure.Message);
        Assert.Contains("no-such-program", failure.Message);
    }

    [Fact]
    public async Task Waiting_for_the_ready_line_of_a_child_that_dies_tells_its_exit_code_and_last_words()
    {
        await using var child = ChildProcess.Start(Children.Play("dies", "cry=the port is taken", "exit=5"));

        var failure = await Assert.ThrowsAsync<ChildFailedException>(
            () => child.WaitForLineAsync(Children.IsReady, Children.Patience, Cancel));

        Assert.Equal(5, failure.Exit?.ExitCode);
        Assert.Contains("the port is taken", failure.Message);
    }

    [Fact]
    public async Task Waiting_for_a_line_that_never_comes_ends_with_the_time_named()
    {
        await using var child = await Children.StartReadyAsync(Children.Play("silent"), Cancel);

        var failure = await Assert.ThrowsAsync<ChildFailedException>(
            () => child.WaitForLineAsync(_ => false, TimeSpan.FromMilliseconds(100), Cancel));

        Assert.Contains("0.1 s", failure.Message);
        Assert.Null(failure.Exit);
    }
}
