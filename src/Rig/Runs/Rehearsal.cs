using System.Globalization;
using System.Net;
using Halfvoice.Coordination;
using Halfvoice.Optimization;
using Halfvoice.Plans;
using Halfvoice.Rehearsal;
using Halfvoice.Rig.Authority;
using Halfvoice.Rig.Binaries;
using Halfvoice.Rig.Processes;
using Halfvoice.Rig.Terminal;

namespace Halfvoice.Rig.Runs;

/// <summary>
/// One rehearsal with real processes: bundles and identities of its own, a coordinator, one agent a site, live progress, and
/// a verdict. Whatever happens, no process is left behind.
/// </summary>
public sealed class Rehearsal
{
    private static readonly TimeSpan ReadyWithin = TimeSpan.FromSeconds(60);
    private static readonly TimeSpan StopGrace = TimeSpan.FromSeconds(10);

    private readonly Plan _plan;
    private readonly SetupBuilder _setups;
    private readonly AgentBinaries _binaries;
    private readonly ProgressView _view;
    private readonly RunFolder _folder;

    public Rehearsal(Plan plan, AgentBinaries binaries, RunFolder folder, ProgressView view)
    {
        _plan = plan;
        _setups = new SetupBuilder(plan);
        _binaries = binaries;
        _folder = folder;
        _view = view;
    }

    /// <summary>Time from the first agent's start until all had joined; null until then.</summary>
    public TimeSpan? ReadyAfter { get; private set; }

    /// <summary>Runs all cycles and judges them.</summary>
    /// <exception cref="RigException">The rehearsal broke.</exception>
    public async Task<Verdict> RunAsync(IReadOnlyDictionary<string, string> options, CancellationToken cancel)
    {
        WriteInputs();
        var optima = Optima();
        try
        {
            await RunProcessesAsync(cancel).ConfigureAwait(false);
        }
        finally
        {
            // After a rehearsal that broke they are needed most.
            CollectLogs();
        }

        cancel.ThrowIfCancellationRequested();
        var scorer = new RunScorer(_plan, _setups, _folder, optima);
        var verdict = scorer.Judge(options, _binaries.Description);
        await File.WriteAllTextAsync(_folder.Verdict, verdict.ToJson() + Environment.NewLine, cancel).ConfigureAwait(false);
        return verdict;
    }

    private void WriteInputs()
    {
        foreach (var (name, text) in PlanWriter.Write(_plan))
        {
            var path = Path.Combine(_folder.Plan, name);
            PrivateFiles.MakeFolder(Path.GetDirectoryName(path)!);
            PrivateFiles.Write(path, text);
        }

        using var authority = LabAuthority.Create(TimeSpan.FromDays(30), TimeProvider.System);
        new BundleWriter(_plan, _setups, authority).WriteAll(_folder.Bundles, ["localhost"], [IPAddress.Loopback]);
    }

    /// <summary>Central optimum of every cycle: the yardstick, known to the rig alone.</summary>
    private Optimum[] Optima()
    {
        var optima = new Optimum[_plan.Cycles];
        var byLoad = new Dictionary<string, Optimum>(StringComparer.Ordinal);
        for (var c = 0; c < optima.Length; c++)
        {
            var load = _plan.LoadMw(c + 1);
            var key = string.Join(';', load.Select(mw => mw.ToString("R", CultureInfo.InvariantCulture)));
            if (!byLoad.TryGetValue(key, out var optimum))
                byLoad[key] = optimum = CentralYardstick.Solve(_plan.Network, load, $"cycle {c + 1}");
            optima[c] = optimum;
        }

        return optima;
    }

    private async Task RunProcessesAsync(CancellationToken cancel)
    {
        // The command line turns a signal into a cancellation, and the cancellation closes the fleet: so a closed fleet always
        // means a cancelled run, and is never taken for a process that failed.
        await using var fleet = new ProcessFleet(killOnSignals: false, cancel);
        var finished = new TaskCompletionSource(TaskCreationOptions.RunContinuationsAsynchronously);
        var ready = new TaskCompletionSource<int>(TaskCreationOptions.RunContinuationsAsynchronously);
        var began = TimeProvider.System.GetTimestamp();
        var coordinator = fleet.Start(new ChildStart("coordinator", _binaries.CoordinatorPath,
            ["--bundle", BundleWriter.CoordinatorFolder(_folder.Bundles), "--state", _folder.CoordinatorState, "--listen", "127.0.0.1:0"])
        {
            ErrorLogPath = Path.Combine(_folder.Logs, "coordinator.err"),
            Environment = _binaries.Environment,
            OnLine = line =>
            {
                if (CoordinatorProgress.Read(line) is not { } news)
                    return;
                if (news.Event == "ready")
                    ready.TrySetResult(news.Port);
                if (news.Event == "gathering" && news.Joined == _plan.Network.Sites.Count)
                    ReadyAfter ??= TimeProvider.System.GetElapsedTime(began);
                if (news.Event == "finished")
                    finished.TrySetResult();
                _view.Show(news);
            },
        });
        var watch = WatchAsync(fleet, coordinator, finished.Task, cancel);
        var first = await Task.WhenAny(ready.Task, watch, Task.Delay(ReadyWithin, cancel)).ConfigureAwait(false);
        cancel.ThrowIfCancellationRequested();
        if (first == watch)
            await watch.ConfigureAwait(false);
        if (!ready.Task.IsCompletedSuccessfully)
            throw new RigException(ExitCodes.Broke, $"The coordinator did not listen within {ReadyWithin.TotalSeconds:0} s. See {_folder.Logs}.");
        began = TimeProvider.System.GetTimestamp();
        var port = await ready.Task.ConfigureAwait(false);
        foreach (var site in _plan.Network.Sites)
            StartAgent(fleet, site, port, cancel);
        await watch.ConfigureAwait(false);
        foreach (var child in fleet.Running)
            child.ExpectExit();
        await Task.WhenAny(Task.WhenAll(fleet.Running.Select(child => child.Exited)), Task.Delay(StopGrace, cancel)).ConfigureAwait(false);
        await fleet.StopAllAsync(StopGrace).ConfigureAwait(false);
    }

    private void StartAgent(ProcessFleet fleet, string site, int port, CancellationToken cancel)
    {
        var start = new ChildStart($"agent {site}", _binaries.AgentPath,
            ["--bundle", BundleWriter.SiteFolder(_folder.Bundles, site), "--state", _folder.SiteState(site),
             "--coordinator", string.Create(CultureInfo.InvariantCulture, $"127.0.0.1:{port}")])
        {
            ErrorLogPath = Path.Combine(_folder.Logs, $"agent-{site}.err"),
            Environment = _binaries.Environment,
        };
        try
        {
            fleet.Start(start);
        }
        catch (InvalidOperationException closed) when (cancel.IsCancellationRequested)
        {
            throw new OperationCanceledException("Stopped while agents were being started.", closed, cancel);
        }
    }

    /// <summary>Waits for the coordinator's end; ends early with the reason when a process dies or time runs out.</summary>
    private async Task WatchAsync(ProcessFleet fleet, ChildProcess coordinator, Task finished, CancellationToken cancel)
    {
        using var limit = CancellationTokenSource.CreateLinkedTokenSource(cancel);
        limit.CancelAfter(LongestRun.Of(_plan));
        var died = FirstFailureAsync(fleet, limit.Token);
        var first = await Task.WhenAny(finished, died).ConfigureAwait(false);
        cancel.ThrowIfCancellationRequested();
        if (first == finished)
        {
            coordinator.ExpectExit();
            return;
        }

        if (died.IsCanceled)
        {
            throw new RigException(ExitCodes.Broke, $"The rehearsal did not end within {LongestRun.Of(_plan).TotalMinutes:0} minutes, "
                + $"the longest that its rounds and deadlines allow. See {_folder.Logs}.");
        }

        throw new RigException(ExitCodes.Broke, $"{await died.ConfigureAwait(false)}{Environment.NewLine}See {_folder.Logs}.");
    }

    /// <summary>The first process that ended without being asked to; an agent that heard the farewell ends with 0 and is none.</summary>
    private static async Task<ChildExit> FirstFailureAsync(ProcessFleet fleet, CancellationToken cancel)
    {
        while (true)
        {
            var exit = await fleet.UnexpectedExits.ReadAsync(cancel).ConfigureAwait(false);
            if (exit.ExitCode != 0)
                return exit;
        }
    }

    /// <summary>Puts the processes' own logs beside the rig's, one file each.</summary>
    private void CollectLogs()
    {
        Copy(_folder.CoordinatorState, "coordinator.jsonl", "coordinator.jsonl");
        foreach (var site in _plan.Network.Sites)
            Copy(_folder.SiteState(site), "agent.jsonl", $"agent-{site}.jsonl");

        void Copy(string from, string name, string to)
        {
            var source = Path.Combine(from, name);
            try
            {
                if (File.Exists(source))
                    File.Copy(source, Path.Combine(_folder.Logs, to), overwrite: true);
            }
            catch (Exception problem) when (problem is IOException or UnauthorizedAccessException)
            {
                // The run's own outcome weighs more than a log that stays where its process wrote it.
                _view.Say($"{to} could not be copied to {_folder.Logs}: {problem.Message}");
            }
        }
    }
}
