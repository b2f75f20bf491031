using System.CommandLine;
using Halfvoice.Rig.Binaries;

namespace Halfvoice.Rig.Commands;

/// <summary>The rig's command line: what there is, and how a command ends.</summary>
public static class RigCommandLine
{
    private const string About = """
        Halfvoice rehearses a coordinated dispatch before it goes live: every site solves its own part, veils its answer, and a coordinator reconciles them.
        A rehearsal is no operating instruction and no certification; protection and local limits stay independent of it.
        Exit codes: 0 passed, 1 a limit failed, 2 the plan or the command line is wrong, 3 the command itself broke or was stopped.
        """;

    /// <summary>Runs one command and returns its exit code; no failure ends in a stack trace.</summary>
    public static async Task<int> RunAsync(string[] args)
    {
        var root = new RootCommand(About)
        {
            RehearseCommand.Create(), CheckCommand.Create(), OptimumCommand.Create(), NewCommand.Create(), PackCommand.Create(), KeysCommand.Create(),
        };
        var parsed = root.Parse(args);
        if (parsed.Errors.Count > 0)
        {
            foreach (var error in parsed.Errors)
                await Console.Error.WriteLineAsync(error.Message).ConfigureAwait(false);
            await Console.Error.WriteLineAsync("'halfvoice --help' lists the commands, 'halfvoice COMMAND --help' what one takes.").ConfigureAwait(false);
            return ExitCodes.PlanWrong;
        }

        try
        {
            return await parsed.InvokeAsync(new InvocationConfiguration { EnableDefaultExceptionHandler = false }).ConfigureAwait(false);
        }
        catch (RigException failure)
        {
            await Console.Error.WriteLineAsync(failure.Message).ConfigureAwait(false);
            return failure.ExitCode;
        }
        catch (BinariesException failure)
        {
            await Console.Error.WriteLineAsync(failure.Message).ConfigureAwait(false);
            return ExitCodes.Broke;
        }
        catch (OperationCanceledException)
        {
            await Console.Error.WriteLineAsync("Stopped as asked; every process of the run has been ended.").ConfigureAwait(false);
            return ExitCodes.Broke;
        }
        catch (Exception failure) when (failure is IOException or UnauthorizedAccessException
            or Microsoft.Data.Sqlite.SqliteException or Processes.ChildFailedException)
        {
            await Console.Error.WriteLineAsync($"The command broke: {failure.Message}").ConfigureAwait(false);
            return ExitCodes.Broke;
        }
#pragma warning disable CA1031 // The last resort: what nobody foresaw is told and ends the command as broken.
        catch (Exception unforeseen)
#pragma warning restore CA1031
        {
            await Console.Error.WriteLineAsync(
                $"The command broke in a way that was not foreseen ({unforeseen.GetType().Name}): {unforeseen.Message} This is a defect of the rig.")
                .ConfigureAwait(false);
            return ExitCodes.Broke;
        }
    }
}
