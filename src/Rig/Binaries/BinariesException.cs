namespace Halfvoice.Rig.Binaries;

/// <summary>The agent's or the coordinator's executable cannot be found or built; the message says what to do.</summary>
public sealed class BinariesException : Exception
{
    public BinariesException(string message)
        : base(message)
    {
    }

    public BinariesException()
    {
    }

    public BinariesException(string message, Exception innerException)
        : base(message, innerException)
    {
    }
}
