namespace Halfvoice.Agent;

/// <summary>The site's own computation broke one of its rules. The text holds no private value.</summary>
internal sealed class SiteBrokenException : Exception
{
    public SiteBrokenException(string message, Exception inner)
        : base(message, inner)
    {
    }

    public SiteBrokenException()
    {
    }

    public SiteBrokenException(string message)
        : base(message)
    {
    }
}
