namespace Halfvoice.Rig;

/// <summary>Something that ends a command with words for the user instead of a stack trace.</summary>
public sealed class RigFailure : Exception
{
    public RigFailure(int exitCode, string message, Exception? inner = null)
        : base(message, inner) => ExitCode = exitCode;

    public RigFailure()
        : this(ExitCodes.Broke, "The command broke.")
    {
    }

    public RigFailure(string message)
        : this(ExitCodes.Broke, message)
    {
    }

    public RigFailure(string message, Exception innerException)
        : this(ExitCodes.Broke, message, innerException)
    {
    }

    public int ExitCode { get; }
}
