namespace Halfvoice.Rig.Processes;

/// <summary>A child ended, or stayed silent, where it had to get ready.</summary>
public sealed class ChildFailedException : Exception
{
    public ChildFailedException(string message, ChildExit? exit = null)
        : base(message) => Exit = exit;

    public ChildFailedException()
    {
    }

    public ChildFailedException(string message, Exception innerException)
        : base(message, innerException)
    {
    }

    /// <summary>How the child ended; null when it lives and stayed silent.</summary>
    public ChildExit? Exit { get; }
}
