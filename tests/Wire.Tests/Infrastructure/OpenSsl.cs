using System.Diagnostics;

namespace Halfvoice.Tests.Infrastructure;

/// <summary>The openssl command line, as a check from outside.</summary>
internal static class OpenSsl
{
    private static readonly bool _isThere = (Environment.GetEnvironmentVariable("PATH") ?? "")
        .Split(Path.PathSeparator).Any(folder => File.Exists(Path.Combine(folder, "openssl")));

    public static void SkipIfAbsent() => Assert.SkipUnless(_isThere, "The openssl command is not installed.");

    /// <summary>Runs it in a folder; the output is standard output and standard error, trimmed.</summary>
    public static async Task<(int ExitCode, string Output)> RunAsync(string folder, CancellationToken cancel, params string[] arguments)
    {
        var info = new ProcessStartInfo("openssl", arguments)
        {
            WorkingDirectory = folder,
            RedirectStandardOutput = true,
            RedirectStandardError = true,
        };
        using var process = Process.Start(info)!;
        var error = process.StandardError.ReadToEndAsync(cancel);
        var output = await process.StandardOutput.ReadToEndAsync(cancel);
        await process.WaitForExitAsync(cancel);
        return (process.ExitCode, (output + await error).Trim());
    }
}
