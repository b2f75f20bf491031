using System.Collections.Concurrent;
using System.Diagnostics;

namespace Halfvoice.Rig.Processes;

/// <summary>
/// Starts processes on one thread that lives as long as the rig. On Linux a child's parent-death signal (see Lifeline) goes off
/// when the thread that started it ends, and threads of the pool come and go.
/// </summary>
internal static class ProcessStarter
{
    private static readonly BlockingCollection<Action> _work = [];
    private static readonly Lazy<Thread> _thread = new(StartThread);

    /// <summary>Starts the process and returns once the new program runs in it.</summary>
    /// <exception cref="ChildFailedException">The executable is missing or cannot be run.</exception>
    public static Process Start(string name, ProcessStartInfo info)
    {
        _ = _thread.Value;
        var started = new TaskCompletionSource<Process>(TaskCreationOptions.RunContinuationsAsynchronously);
        _work.Add(() => StartOne(name, info, started));
        return started.Task.GetAwaiter().GetResult();
    }

    private static void StartOne(string name, ProcessStartInfo info, TaskCompletionSource<Process> started)
    {
        try
        {
            started.SetResult(Process.Start(info) ?? throw new InvalidOperationException("No process came of it."));
        }
        catch (Exception failure) when (failure is System.ComponentModel.Win32Exception or InvalidOperationException or IOException)
        {
            started.SetException(new ChildFailedException(
                $"{name} cannot be started from '{info.FileName}': {failure.Message} Check that the file is there and may be executed.",
                failure));
        }
    }

    private static Thread StartThread()
    {
        var thread = new Thread(() =>
        {
            foreach (var action in _work.GetConsumingEnumerable())
                action();
        })
        { IsBackground = true, Name = "process-starter" };
        thread.Start();
        return thread;
    }
}
