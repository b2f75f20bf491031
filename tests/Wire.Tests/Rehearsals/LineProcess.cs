using System.Diagnostics;
using System.Runtime.InteropServices;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>
/// A process whose every line is kept and can be waited for, on both of its outputs. It hangs on a lifeline (its standard
/// input), so that it ends with the tests.
/// </summary>
internal sealed class LineProcess : IAsyncDisposable
{
    /// <summary>Far more than anything here takes: a test that waits this long has failed, it is not slow.</summary>
    public static readonly TimeSpan Patience = TimeSpan.FromMinutes(3);

    private readonly Lock _gate = new();
    private readonly List<(bool IsError, string Text)> _lines = [];
    private readonly List<(Func<string, bool> Wanted, TaskCompletionSource<string> Heard)> _waiting = [];
    private readonly Process _process;

    private LineProcess(string name, Process process)
    {
        Name = name;
        _process = process;
        ProcessId = process.Id;
        Exited = WatchAsync(ReadAsync(process.StandardOutput, false), ReadAsync(process.StandardError, true));
    }

    public string Name { get; }

    public int ProcessId { get; }

    /// <summary>Completes with the exit code when the process has ended and all of its output is read.</summary>
    public Task<int> Exited { get; }

    public string Output => Text(false);

    public string Errors => Text(true);

    public static LineProcess Start(string name, string executable, IEnumerable<string> arguments, IReadOnlyDictionary<string,
        string?>? environment = null, string? workingFolder = null)
    {
        var info = new ProcessStartInfo(executable, arguments)
        {
            RedirectStandardInput = true,
            RedirectStandardOutput = true,
            RedirectStandardError = true,
            WorkingDirectory = workingFolder ?? "",
        };
        info.Environment["HALFVOICE_LIFELINE"] = "stdin";
        foreach (var (key, value) in environment ?? new Dictionary<string, string?>())
            info.Environment[key] = value;
        return new LineProcess(name, Process.Start(info)!);
    }

    /// <summary>Waits for a line of either output; one that was said already counts.</summary>
    public async Task<string> WaitForAsync(Func<string, bool> wanted, CancellationToken cancel)
    {
        Task<string> heard;
        lock (_gate)
        {
            if (_lines.FirstOrDefault(line => wanted(line.Text)).Text is { } said)
                return said;
            var source = new TaskCompletionSource<string>(TaskCreationOptions.RunContinuationsAsynchronously);
            _waiting.Add((wanted, source));
            heard = source.Task;
        }

        var first = await Task.WhenAny(heard, Exited).WaitAsync(Patience, cancel);
        Assert.True(first == heard || heard.IsCompleted, $"{Name} ended before it said what was waited for.\n{Output}\n{Errors}");
        return await heard;
    }

    /// <summary>Waits for the end and returns the exit code.</summary>
    public async Task<int> EndAsync(CancellationToken cancel)
    {
        var ended = Exited.WaitAsync(Patience, cancel);
        await Task.WhenAny(ended);
        Assert.True(ended.IsCompletedSuccessfully, $"{Name} did not end. Its last words:\n{Errors}");
        return await Exited;
    }

    /// <summary>Ends the standard input, for programs that read it.</summary>
    public void CloseInput() => _process.StandardInput.Dispose();

    public void Kill() => _process.Kill();

    /// <summary>Sends a signal by its number.</summary>
    public void Signal(int number) => Assert.Equal(0, SendSignal(ProcessId, number));

    public async ValueTask DisposeAsync()
    {
        if (!Exited.IsCompleted)
            _process.Kill(entireProcessTree: true);
        await Exited;
        _process.Dispose();
    }

    [DllImport("libc", EntryPoint = "kill", SetLastError = true)]
    [DefaultDllImportSearchPaths(DllImportSearchPath.SafeDirectories)]
    private static extern int SendSignal(int processId, int signal);

    private async Task<int> WatchAsync(Task output, Task errors)
    {
        await _process.WaitForExitAsync();
        await Task.WhenAll(output, errors);
        return _process.ExitCode;
    }

    private async Task ReadAsync(StreamReader reader, bool isError)
    {
        while (await reader.ReadLineAsync() is { } line)
        {
            lock (_gate)
            {
                _lines.Add((isError, line));
                foreach (var (_, heard) in _waiting.Where(pair => pair.Wanted(line)).ToList())
                    heard.TrySetResult(line);
            }
        }
    }

    private string Text(bool isError)
    {
        lock (_gate)
            return string.Join('\n', _lines.Where(line => line.IsError == isError).Select(line => line.Text));
    }
}
