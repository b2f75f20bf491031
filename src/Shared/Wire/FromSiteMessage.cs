using Halfvoice.Coordination;

namespace Halfvoice.Wire;

/// <summary>A checked message from a site.</summary>
public abstract record FromSiteMessage
{
    private FromSiteMessage()
    {
    }

    public sealed record Enrolled(string Site, Enrol Enrol) : FromSiteMessage;

    public sealed record Answered(Answer Answer) : FromSiteMessage;

    public sealed record Refused(Refusal Refusal) : FromSiteMessage;

    public sealed record Pulse : FromSiteMessage;

    public sealed record Farewell : FromSiteMessage;
}
