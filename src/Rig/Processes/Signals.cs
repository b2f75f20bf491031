using System.Diagnostics;
using System.Runtime.InteropServices;
using System.Runtime.Versioning;

namespace Halfvoice.Rig.Processes;

/// <summary>Signals to a process of ours. None of them fails when the process is already gone.</summary>
internal static class Signals
{
    private const int TerminateNumber = 15;

    // SIGSTOP and SIGCONT are the two whose numbers differ between Linux and the BSD family.
    private static readonly int _pauseNumber = OperatingSystem.IsLinux() ? 19 : 17;
    private static readonly int _resumeNumber = OperatingSystem.IsLinux() ? 18 : 19;

    /// <summary>Asks for a clean stop (SIGTERM). False where the system knows no such signal.</summary>
    public static bool Terminate(Process process) => Send(process, TerminateNumber);

    /// <summary>Pauses (SIGSTOP). False where the system knows no such signal.</summary>
    public static bool Pause(Process process) => Send(process, _pauseNumber);

    /// <summary>Resumes a paused process (SIGCONT). False where the system knows no such signal.</summary>
    public static bool Resume(Process process) => Send(process, _resumeNumber);

    /// <summary>Ends the process at once, paused or not.</summary>
    public static void Kill(Process process)
    {
        try
        {
            process.Kill();
        }
        catch (Exception gone) when (gone is InvalidOperationException or System.ComponentModel.Win32Exception)
        {
            // It ended between our look and our signal, which is what we wanted.
        }
    }

    private static bool Send(Process process, int signal)
    {
        if (OperatingSystem.IsWindows())
            return false;
        // The runtime collects an ended child by itself, and its id may then belong to a stranger: look first.
        if (!process.HasExited)
            _ = SendSignal(process.Id, signal);
        return true;
    }

    [UnsupportedOSPlatform("windows")]
    [DllImport("libc", EntryPoint = "kill", SetLastError = true)]
    [DefaultDllImportSearchPaths(DllImportSearchPath.SafeDirectories)]
    private static extern int SendSignal(int processId, int signal);
}
