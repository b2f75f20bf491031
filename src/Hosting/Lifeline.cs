using System.Diagnostics;
using System.Runtime.InteropServices;
using System.Runtime.Versioning;

namespace Halfvoice.Hosting;

/// <summary>
/// Ends this process when the one that started it is gone. The starter holds the writing end of a pipe that is our standard
/// input and never writes to it; whatever ends the starter (SIGKILL included) closes that end, and we read end-of-file.
/// </summary>
/// <remarks>
/// A process that was paused (SIGSTOP) cannot read, so on Linux the kernel is asked to send SIGCONT when the starter goes:
/// a paused process resumes and then sees the end-of-file. SIGCONT does nothing to a process that runs.
/// The lifeline is watched only where the starter asked for it with <see cref="Variable"/>: under a service manager or in a
/// container the standard input is closed from the start, and that means nothing there.
/// </remarks>
internal static class Lifeline
{
    /// <summary>Environment variable by which a starter says that it holds the lifeline: <see cref="OnStandardInput"/>.</summary>
    public const string Variable = "HALFVOICE_LIFELINE";

    /// <summary>The one value of <see cref="Variable"/>.</summary>
    public const string OnStandardInput = "stdin";

    /// <summary>Exit code of a process whose lifeline was cut and that did not stop by itself within the grace.</summary>
    public const int CutExitCode = 20;

    /// <summary>How long a process may take to stop by itself after the cut when nothing else is said.</summary>
    public static readonly TimeSpan DefaultGrace = TimeSpan.FromSeconds(2);

    // Process-exit handlers run inside Environment.Exit and may hang; this is how long they get before the process kills itself.
    private static readonly TimeSpan ExitHandlersGrace = TimeSpan.FromSeconds(1);

    /// <summary>
    /// Starts to watch, if the starter asked for it. On the cut, <paramref name="requestStop"/> runs once; a process still alive
    /// <paramref name="grace"/> later leaves with <see cref="CutExitCode"/>, and kills itself when even that hangs.
    /// </summary>
    /// <param name="requestStop">Asks the host for its ordinary clean shutdown. It may block or throw without harm.</param>
    /// <param name="grace">0 to 60 s; <see cref="DefaultGrace"/> when null.</param>
    /// <returns>True when a lifeline is watched from now on.</returns>
    public static bool Watch(Action requestStop, TimeSpan? grace = null)
    {
        ArgumentNullException.ThrowIfNull(requestStop);
        var bound = grace ?? DefaultGrace;
        ArgumentOutOfRangeException.ThrowIfLessThan(bound, TimeSpan.Zero);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(bound, TimeSpan.FromSeconds(60));
        if (Environment.GetEnvironmentVariable(Variable) != OnStandardInput)
            return false;

        if (OperatingSystem.IsLinux())
            ResumeWhenStarterGoes();
        StartThread("lifeline", () =>
        {
            ReadToEnd();
            EndProcess(requestStop, bound);
        });
        return true;
    }

    private static void ReadToEnd()
    {
        using var input = Console.OpenStandardInput();
        Span<byte> ignored = stackalloc byte[64];
        try
        {
            while (input.Read(ignored) > 0)
            {
                // Nothing is ever sent this way; bytes that arrive anyway carry no meaning.
            }
        }
        catch (IOException)
        {
            // A pipe that cannot be read any more has lost its other end just as surely as one that ended.
        }
    }

    private static void EndProcess(Action requestStop, TimeSpan grace)
    {
        // Each step has a thread of its own, so that a step that hangs cannot keep the next from its time.
        StartThread("lifeline-stop", () => RequestStop(requestStop));
        Thread.Sleep(grace);
        StartThread("lifeline-exit", () => Environment.Exit(CutExitCode));
        Thread.Sleep(ExitHandlersGrace);
        using var self = Process.GetCurrentProcess();
        self.Kill();
    }

    private static void RequestStop(Action requestStop)
    {
        try
        {
            requestStop();
        }
#pragma warning disable CA1031 // Whatever the host's own shutdown throws, the process must still end; the failure is told.
        catch (Exception failure)
#pragma warning restore CA1031
        {
            Console.Error.WriteLine($"The starter is gone, and the clean stop failed: {failure.GetType().Name}.");
        }
    }

    private static void StartThread(string name, Action body) =>
        new Thread(() => body()) { IsBackground = true, Name = name }.Start();

    [SupportedOSPlatform("linux")]
    private static void ResumeWhenStarterGoes()
    {
        const int setParentDeathSignal = 1;
        const int continueSignal = 18;
        if (SetProcessOption(setParentDeathSignal, continueSignal, 0, 0, 0) != 0)
        {
            // Without it the lifeline still ends every process that runs; only a paused one would wait for its next SIGCONT.
            Console.Error.WriteLine($"A paused process would outlive its starter here: prctl gave {Marshal.GetLastPInvokeError()}.");
        }
    }

    [SupportedOSPlatform("linux")]
    [DllImport("libc", EntryPoint = "prctl", SetLastError = true)]
    [DefaultDllImportSearchPaths(DllImportSearchPath.SafeDirectories)]
    private static extern int SetProcessOption(int option, nuint argument, nuint unused3, nuint unused4, nuint unused5);
}
