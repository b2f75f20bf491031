using Halfvoice.Rig.Processes;

namespace Halfvoice.Tests.Child;

/// <summary>
/// Plays the rig: starts a fleet of played children that all report to one witness, pauses them where "paused" is asked for,
/// says that it is ready, and waits for its own end. All other options go to the children.
/// </summary>
internal static class PlayedParent
{
    public static async Task<int> RunAsync(int count, string witness, string[] options)
    {
        await using var fleet = new ProcessFleet();
        var childOptions = options.Where(option => option != "paused");
        var starts = Enumerable.Range(0, count)
            .Select(number => new ChildStart($"child {number}", Environment.ProcessPath!, ["child", $"witness={witness}", .. childOptions]))
            .ToList();
        var children = await fleet.StartAllAsync(starts, line => line.Contains("\"ready\":true"), TimeSpan.FromMinutes(2));
        if (options.Contains("paused"))
        {
            foreach (var child in children)
                child.Pause();
        }

        Console.WriteLine($$"""{"ready":true,"pids":[{{string.Join(",", children.Select(child => child.ProcessId))}}]}""");
        await new TaskCompletionSource().Task;
        return 0;
    }
}
