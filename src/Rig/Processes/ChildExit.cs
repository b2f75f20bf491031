namespace Halfvoice.Rig.Processes;

/// <summary>How a child ended.</summary>
/// <param name="Name">The child's name.</param>
/// <param name="ProcessId">The id that it had.</param>
/// <param name="ExitCode">Its exit code; 128 + n for a child that signal n ended.</param>
/// <param name="WasExpected">True when we stopped or killed it, or had said that it would end.</param>
/// <param name="LastErrorLines">The end of its standard error, oldest first, at most <see cref="KeptErrorLines"/> lines.</param>
/// <param name="OutputFailure">What failed in handling its output (a full disk, a line handler); null when nothing did.</param>
public sealed record ChildExit(
    string Name,
    int ProcessId,
    int ExitCode,
    bool WasExpected,
    IReadOnlyList<string> LastErrorLines,
    Exception? OutputFailure)
{
    /// <summary>Lines of standard error that are kept in memory.</summary>
    public const int KeptErrorLines = 20;

    /// <summary>One paragraph for a person: who ended, how, and its last words.</summary>
    public override string ToString()
    {
        var how = ExitCode > 128 ? $"was ended by signal {ExitCode - 128}" : $"ended with exit code {ExitCode}";
        var words = LastErrorLines.Count == 0
            ? "It wrote nothing to standard error."
            : "Its last words:" + Environment.NewLine + "  " + string.Join(Environment.NewLine + "  ", LastErrorLines);
        return $"{Name} (process {ProcessId}) {how}. {words}";
    }
}
