using Halfvoice.Rig.Commands;

namespace Halfvoice.Tests.Commands;

/// <summary>Runs the rig's command line in this process and keeps what it writes. The console is the process's: one test at a time.</summary>
internal static class RigConsole
{
    public static async Task<RigResult> RunAsync(params string[] arguments)
    {
        var (output, errors) = (Console.Out, Console.Error);
        using var newOutput = new StringWriter();
        using var newErrors = new StringWriter();
        Console.SetOut(newOutput);
        Console.SetError(newErrors);
        try
        {
            var code = await RigCommandLine.RunAsync(arguments);
            return new RigResult(code, newOutput.ToString(), newErrors.ToString());
        }
        finally
        {
            Console.SetOut(output);
            Console.SetError(errors);
        }
    }
}

/// <summary>How a command ended and what it wrote.</summary>
internal sealed record RigResult(int ExitCode, string Output, string Errors)
{
    /// <summary>The command refused: exit code 2, words on standard error that hold all of these, no result, no stack trace.</summary>
    public void AssertRefused(params string[] words)
    {
        Assert.True(ExitCode == 2, $"exit code {ExitCode}: {Errors}");
        Assert.All(words, word => Assert.Contains(word, Errors, StringComparison.OrdinalIgnoreCase));
        Assert.DoesNotContain("   at ", Output + Errors, StringComparison.Ordinal);
        Assert.DoesNotContain("Exception", Output + Errors, StringComparison.Ordinal);
    }
}
