using System.Diagnostics;
using System.Text;
using System.Threading.Channels;
using Halfvoice.Hosting;

namespace Halfvoice.Rig.Processes;

/// <summary>
/// One process that we started, on a lifeline: its standard input is a pipe whose other end only we hold, so that it ends when we
/// do, however that happens (see Lifeline). The runtime opens these pipes close-on-exec, so no sibling inherits them.
/// </summary>
public sealed class ChildProcess : IAsyncDisposable
{
    // A grandchild that inherited the output pipe can hold it open after the child is gone; we do not wait for it longer than this.
    private static readonly TimeSpan _drainBound = TimeSpan.FromSeconds(2);

    private readonly Process _process;
    private readonly Channel<string> _lines;
    private readonly ErrorLog _errors;
    private long _droppedLines;
    private volatile bool _exitIsExpected;

    private ChildProcess(ChildStart start, ErrorLog errors, Process process)
    {
        Name = start.Name;
        ProcessId = process.Id;
        _process = process;
        _errors = errors;
        _lines = Channel.CreateBounded<string>(
            new BoundedChannelOptions(start.LineCapacity) { FullMode = BoundedChannelFullMode.DropOldest },
            _ => Interlocked.Increment(ref _droppedLines));
        var output = new LinePump(process.StandardOutput.BaseStream, line => HandOn(line, start.OnLine)).RunAsync();
        var error = new LinePump(process.StandardError.BaseStream, errors.Add).RunAsync();
        Exited = WatchAsync(output, error);
    }

    /// <summary>The name it was started under.</summary>
    public string Name { get; }

    /// <summary>Its process id; belongs to it only until <see cref="Exited"/>.</summary>
    public int ProcessId { get; }

    /// <summary>Its lines of standard output. Completes when the output ends.</summary>
    public ChannelReader<string> Lines => _lines.Reader;

    /// <summary>Lines dropped from <see cref="Lines"/> because nobody read them in time.</summary>
    public long DroppedLines => Interlocked.Read(ref _droppedLines);

    /// <summary>Completes when the process has ended and its output is read; never faults.</summary>
    public Task<ChildExit> Exited { get; }

    /// <summary>True once the process has ended.</summary>
    public bool HasExited => _process.HasExited;

    /// <summary>Starts a process.</summary>
    /// <exception cref="ChildFailedException">The executable is missing or cannot be run.</exception>
    public static ChildProcess Start(ChildStart start)
    {
        ArgumentNullException.ThrowIfNull(start);
        ArgumentOutOfRangeException.ThrowIfLessThan(start.LineCapacity, 1);
        ArgumentOutOfRangeException.ThrowIfNegative(start.ErrorLogLimitBytes);
        var info = new ProcessStartInfo(start.Executable)
        {
            RedirectStandardInput = true,
            RedirectStandardOutput = true,
            RedirectStandardError = true,
            StandardOutputEncoding = Encoding.UTF8,
            StandardErrorEncoding = Encoding.UTF8,
            UseShellExecute = false,
            CreateNoWindow = true,
            WorkingDirectory = start.WorkingFolder ?? "",
        };
        foreach (var argument in start.Arguments)
            info.ArgumentList.Add(argument);
        info.Environment[Lifeline.Variable] = Lifeline.OnStandardInput;
        foreach (var (name, value) in start.Environment)
            info.Environment[name] = value;

        var errors = new ErrorLog(start.ErrorLogPath, start.ErrorLogLimitBytes);
        try
        {
            return new ChildProcess(start, errors, ProcessStarter.Start(start.Name, info));
        }
        catch
        {
            errors.Dispose();
            throw;
        }
    }

    /// <summary>Waits for a line of standard output and returns it. Lines before it are consumed.</summary>
    /// <param name="wanted">Says which line is meant.</param>
    /// <param name="within">How long to wait.</param>
    /// <param name="cancel">Gives up earlier.</param>
    /// <exception cref="ChildFailedException">The child ended first, or the time was up.</exception>
    public async Task<string> WaitForLineAsync(Func<string, bool> wanted, TimeSpan within, CancellationToken cancel = default)
    {
        ArgumentNullException.ThrowIfNull(wanted);
        using var bound = CancellationTokenSource.CreateLinkedTokenSource(cancel);
        bound.CancelAfter(within);
        try
        {
            await foreach (var line in Lines.ReadAllAsync(bound.Token).ConfigureAwait(false))
            {
                if (wanted(line))
                    return line;
            }
        }
        catch (OperationCanceledException) when (!cancel.IsCancellationRequested)
        {
            throw new ChildFailedException(
                $"{Name} (process {ProcessId}) did not say within {within.TotalSeconds:0.#} s what was waited for. " +
                $"Its last words on standard error: {string.Join(" / ", _errors.LastLines)}");
        }

        var exit = await Exited.WaitAsync(cancel).ConfigureAwait(false);
        throw new ChildFailedException($"{exit} It ended before it was ready.", exit);
    }

    /// <summary>Says that this child is about to end and that this is no failure.</summary>
    public void ExpectExit() => ExpectExitFromNowOn();

    /// <summary>Pauses the process (SIGSTOP). False where the system cannot.</summary>
    public bool Pause() => Signals.Pause(_process);

    /// <summary>Resumes the paused process (SIGCONT). False where the system cannot.</summary>
    public bool Resume() => Signals.Resume(_process);

    /// <summary>Ends the process at once. Nothing happens when it is already gone.</summary>
    public void Kill()
    {
        ExpectExitFromNowOn();
        Signals.Kill(_process);
    }

    /// <summary>Ends the process and all that it started, for commands that have helpers of their own.</summary>
    internal void KillTree()
    {
        ExpectExitFromNowOn();
        try
        {
            _process.Kill(entireProcessTree: true);
        }
        catch (Exception gone) when (gone is InvalidOperationException or System.ComponentModel.Win32Exception or AggregateException)
        {
            // Some of them ended between our look and our signal.
        }
    }

    /// <summary>
    /// Resumes the process if it is paused, asks it to stop (SIGTERM; where there is none, by cutting its lifeline), and kills it
    /// when it is still there after <paramref name="grace"/>. Never throws, also when it is already gone.
    /// </summary>
    public async Task<ChildExit> StopAsync(TimeSpan grace)
    {
        ExpectExitFromNowOn();
        var asked = Signals.Terminate(_process);
        Signals.Resume(_process);
        if (!asked)
            CutLifeline();
        if (await Task.WhenAny(Exited, Task.Delay(grace)).ConfigureAwait(false) != Exited)
            Signals.Kill(_process);
        return await Exited.ConfigureAwait(false);
    }

    /// <summary>Kills the process if it still runs, and waits for its end.</summary>
    public async ValueTask DisposeAsync()
    {
        Kill();
        await Exited.ConfigureAwait(false);
    }

    private void ExpectExitFromNowOn()
    {
        // A child that is already gone went by itself, and stopping it afterwards must not hide that.
        if (!_process.HasExited)
            _exitIsExpected = true;
    }

    private void HandOn(string line, Action<string>? onLine)
    {
        _lines.Writer.TryWrite(line);
        onLine?.Invoke(line);
    }

    private async Task<ChildExit> WatchAsync(Task<Exception?> output, Task<Exception?> error)
    {
        await _process.WaitForExitAsync().ConfigureAwait(false);
        var pumps = Task.WhenAll(output, error);
        await Task.WhenAny(pumps, Task.Delay(_drainBound)).ConfigureAwait(false);
        var failure = pumps.IsCompletedSuccessfully ? pumps.Result[0] ?? pumps.Result[1] : pumps.Exception;
        _lines.Writer.TryComplete();
        var exit = new ChildExit(Name, ProcessId, _process.ExitCode, _exitIsExpected, _errors.LastLines, failure);
        CutLifeline();
        _process.StandardOutput.Dispose();
        _process.StandardError.Dispose();
        _errors.Dispose();
        return exit;
    }

    /// <summary>Closes our end of the lifeline, as if the rig were gone; the child then ends by itself.</summary>
    public void CutLifeline()
    {
        try
        {
            _process.StandardInput.Dispose();
        }
        catch (IOException)
        {
            // The reading end is gone already, and with it the need for the lifeline.
        }
    }
}
