namespace Halfvoice.Rig;

/// <summary>Something that ends a command with words for the user instead of a stack trace.</summary>
public sealed class RigException : Exception
{
    public RigException(int exitCode, string message, Exception? inner = null)
        : base(message, inner) => ExitCode = exitCode;

    public RigException()
        : this(ExitCodes.Broke, "The command broke.")
    {
    }

    public RigException(string message)
        : this(ExitCodes.Broke, message)
    {
    }

    public RigException(string message, Exception innerException)
        : this(ExitCodes.Broke, message, innerException)
    {
    }

    public int ExitCode { get; }
}
