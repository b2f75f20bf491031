using Halfvoice.Rig.Processes;

namespace Halfvoice.Tests.Infrastructure;

/// <summary>How the tests start the test child.</summary>
internal static class Children
{
    /// <summary>Far more than anything here takes: a test that waits this long has failed, it is not slow.</summary>
    public static readonly TimeSpan Patience = TimeSpan.FromMinutes(2);

    /// <summary>The exit code of a test child that was asked to stop and did.</summary>
    public const int CleanStop = 7;

    public static string Executable { get; } = Path.Combine(
        AppContext.BaseDirectory, "halfvoice-test-child" + (OperatingSystem.IsWindows() ? ".exe" : ""));

    public static ChildStart Play(string name, params string[] options) => new(name, Executable, ["child", .. options]);

    public static bool IsReady(string line) => line.StartsWith("{\"ready\":true", StringComparison.Ordinal);

    public static async Task<ChildProcess> StartReadyAsync(ChildStart start, CancellationToken cancel)
    {
        var child = ChildProcess.Start(start);
        await child.WaitForLineAsync(IsReady, Patience, cancel);
        return child;
    }
}
