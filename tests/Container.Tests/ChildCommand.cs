using System.ComponentModel;
using System.Diagnostics;

namespace Halfvoice.Containers;

/// <summary>What a command left behind when it ended.</summary>
/// <param name="ExitCode">0 to 255 by convention of the operating system; 127 where the program was not found.</param>
/// <param name="Output">All of its standard output.</param>
/// <param name="Errors">All of its standard error.</param>
internal sealed record CommandResult(int ExitCode, string Output, string Errors)
{
    /// <summary>The last lines of what it said, for the message of a failed test.</summary>
    public string Tail => string.Join('\n', (Output + Errors).TrimEnd().Split('\n').TakeLast(15));
}

/// <summary>Runs a command of this machine to its end, without a shell.</summary>
internal static class ChildCommand
{
    /// <summary>
    /// Runs <paramref name="program"/> in the top level of the repository; kills it and everything that it started when
    /// <paramref name="cancellation"/> fires.
    /// </summary>
    public static async Task<CommandResult> RunAsync(string program, IEnumerable<string> arguments, CancellationToken cancellation)
    {
        var start = new ProcessStartInfo(program, arguments)
        {
            WorkingDirectory = Repository.Root,
            RedirectStandardInput = true,
            RedirectStandardOutput = true,
            RedirectStandardError = true,
        };

        // A build inside a test run must find its SDK by itself, not through the variables of the build that runs the tests.
        foreach (var name in start.Environment.Keys.Where(k => k.StartsWith("MSBUILD", StringComparison.OrdinalIgnoreCase)).ToList())
        {
            start.Environment.Remove(name);
        }

        using var process = new Process { StartInfo = start };
        try
        {
            process.Start();
        }
        catch (Win32Exception notFound)
        {
            return new CommandResult(127, string.Empty, $"{program}: {notFound.Message}");
        }

        process.StandardInput.Close();
        using var kill = cancellation.Register(() => process.Kill(entireProcessTree: true));
        var output = process.StandardOutput.ReadToEndAsync(CancellationToken.None);
        var errors = process.StandardError.ReadToEndAsync(CancellationToken.None);
        await process.WaitForExitAsync(CancellationToken.None);
        cancellation.ThrowIfCancellationRequested();
        return new CommandResult(process.ExitCode, await output, await errors);
    }
}
