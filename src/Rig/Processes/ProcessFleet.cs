using System.Runtime.InteropServices;
using System.Threading.Channels;

namespace Halfvoice.Rig.Processes;

/// <summary>
/// All processes of a rehearsal. None outlives the fleet: it kills them when it is disposed of, when its token is cancelled, when
/// the rig exits and, unless told otherwise, when the rig is interrupted; and each hangs on a lifeline for the case that the rig
/// can do nothing any more.
/// </summary>
public sealed class ProcessFleet : IAsyncDisposable
{
    private readonly Lock _gate = new();
    private readonly Dictionary<string, ChildProcess> _children = [];
    private readonly Channel<ChildExit> _unexpectedExits = Channel.CreateBounded<ChildExit>(KeptExits);
    private readonly List<PosixSignalRegistration> _signals = [];
    private readonly CancellationTokenRegistration _cancelled;
    private bool _closed;

    /// <summary>Unexpected exits that <see cref="UnexpectedExits"/> keeps for a reader that lags; more are dropped.</summary>
    public const int KeptExits = 10_000;

    /// <param name="killOnSignals">
    /// Kill everything on SIGINT, SIGTERM and SIGHUP before the rig itself ends by them. Pass false in a rig that handles them
    /// and cancels <paramref name="cancel"/> when it is done with its own clean-up.
    /// </param>
    /// <param name="cancel">Kills everything when cancelled; nothing can be started afterwards.</param>
    public ProcessFleet(bool killOnSignals = true, CancellationToken cancel = default)
    {
        AppDomain.CurrentDomain.ProcessExit += OnProcessExit;
        if (killOnSignals)
        {
            foreach (var signal in new[] { PosixSignal.SIGINT, PosixSignal.SIGTERM, PosixSignal.SIGHUP })
                _signals.Add(PosixSignalRegistration.Create(signal, _ => Close()));
        }

        _cancelled = cancel.Register(() => Close());
    }

    /// <summary>The children that live now.</summary>
    public IReadOnlyList<ChildProcess> Running
    {
        get
        {
            lock (_gate)
                return [.. _children.Values];
        }
    }

    /// <summary>Children that ended without being asked to, as they end. Completes when the fleet is disposed of.</summary>
    public ChannelReader<ChildExit> UnexpectedExits => _unexpectedExits.Reader;

    /// <summary>The living child of that name, or null.</summary>
    public ChildProcess? Find(string name)
    {
        lock (_gate)
            return _children.GetValueOrDefault(name);
    }

    /// <summary>Starts a child. A name may be used again once its former bearer has ended.</summary>
    /// <exception cref="ChildFailedException">The executable cannot be run.</exception>
    /// <exception cref="InvalidOperationException">The fleet is closed, or the name is taken by a living child.</exception>
    public ChildProcess Start(ChildStart start)
    {
        ArgumentNullException.ThrowIfNull(start);
        ChildProcess child;
        // Starting under the lock leaves no gap in which a closing fleet could miss a new child.
        lock (_gate)
        {
            if (_closed)
                throw new InvalidOperationException($"{start.Name} is not started: the fleet is closed.");
            if (_children.TryGetValue(start.Name, out var former) && !former.HasExited)
                throw new InvalidOperationException($"{start.Name} is running already, as process {former.ProcessId}.");
            child = ChildProcess.Start(start);
            _children[start.Name] = child;
        }

        _ = ForgetAfterExitAsync(child);
        return child;
    }

    /// <summary>Starts a child and waits until it says that it is ready; kills it when that does not come about.</summary>
    /// <returns>The child and its ready line.</returns>
    /// <exception cref="ChildFailedException">It cannot be run, ended first, or said nothing in time.</exception>
    public async Task<(ChildProcess Child, string ReadyLine)> StartReadyAsync(
        ChildStart start, Func<string, bool> isReady, TimeSpan within, CancellationToken cancel = default)
    {
        var child = Start(start);
        try
        {
            return (child, await child.WaitForLineAsync(isReady, within, cancel).ConfigureAwait(false));
        }
        catch
        {
            child.Kill();
            throw;
        }
    }

    /// <summary>
    /// Starts many children, at most <paramref name="atOnce"/> of them between start and ready at any time, because hundreds of
    /// processes that load at once take longer than the same ones in a queue.
    /// </summary>
    /// <param name="starts">What to start; the first failure stops the rest.</param>
    /// <param name="isReady">Says which line of a child means that it is ready.</param>
    /// <param name="within">Time that each child has from its start to its ready line.</param>
    /// <param name="atOnce">1 and up; default twice the processors.</param>
    /// <param name="cancel">Stops starting.</param>
    /// <returns>The children, in the order of <paramref name="starts"/>.</returns>
    /// <exception cref="ChildFailedException">A child did not become ready.</exception>
    public async Task<IReadOnlyList<ChildProcess>> StartAllAsync(
        IReadOnlyList<ChildStart> starts,
        Func<string, bool> isReady,
        TimeSpan within,
        int? atOnce = null,
        CancellationToken cancel = default)
    {
        ArgumentNullException.ThrowIfNull(starts);
        var children = new ChildProcess[starts.Count];
        var options = new ParallelOptions
        {
            MaxDegreeOfParallelism = atOnce ?? 2 * Environment.ProcessorCount,
            CancellationToken = cancel,
        };
        await Parallel.ForEachAsync(Enumerable.Range(0, starts.Count), options, async (index, token) =>
            (children[index], _) = await StartReadyAsync(starts[index], isReady, within, token).ConfigureAwait(false))
            .ConfigureAwait(false);
        return children;
    }

    /// <summary>Stops every child: asks, waits <paramref name="grace"/>, kills. Never throws.</summary>
    public async Task<IReadOnlyList<ChildExit>> StopAllAsync(TimeSpan grace) =>
        await Task.WhenAll(Running.Select(child => child.StopAsync(grace))).ConfigureAwait(false);

    /// <summary>Kills every child at once, paused ones too, and returns without waiting for their end.</summary>
    public void KillAll()
    {
        foreach (var child in Running)
            child.Kill();
    }

    /// <summary>Kills what still runs and waits for its end.</summary>
    public async ValueTask DisposeAsync()
    {
        AppDomain.CurrentDomain.ProcessExit -= OnProcessExit;
        await _cancelled.DisposeAsync().ConfigureAwait(false);
        foreach (var signal in _signals)
            signal.Dispose();
        var last = Close();
        await Task.WhenAll(last.Select(child => child.Exited)).ConfigureAwait(false);
        _unexpectedExits.Writer.TryComplete();
    }

    private void OnProcessExit(object? sender, EventArgs e) => Close();

    private IReadOnlyList<ChildProcess> Close()
    {
        IReadOnlyList<ChildProcess> last;
        lock (_gate)
        {
            _closed = true;
            last = [.. _children.Values];
        }

        foreach (var child in last)
            child.Kill();
        return last;
    }

    private async Task ForgetAfterExitAsync(ChildProcess child)
    {
        var exit = await child.Exited.ConfigureAwait(false);
        lock (_gate)
        {
            if (_children.GetValueOrDefault(child.Name) == child)
                _children.Remove(child.Name);
        }

        if (!exit.WasExpected)
            _unexpectedExits.Writer.TryWrite(exit);
    }
}
