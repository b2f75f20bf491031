using Halfvoice.Coordination;

namespace Halfvoice.Coordinator;

/// <summary>What reaches the host's one queue.</summary>
internal abstract record HostEvent
{
    private HostEvent()
    {
    }

    /// <summary>A stream with a proven identity and a readable enrolment asks for its seat.</summary>
    public sealed record Joining(SiteStream Stream, Enrol Enrol) : HostEvent;

    public sealed record Leaving(SiteStream Stream) : HostEvent;

    public sealed record Answered(SiteStream Stream, Answer Answer) : HostEvent;

    public sealed record Refused(SiteStream Stream, Refusal Refusal) : HostEvent;

    /// <summary>Something unreadable or out of order came in; it is counted and journalled.</summary>
    public sealed record Faulty(SiteStream Stream, Refusal Refusal) : HostEvent;

    public sealed record Woke : HostEvent;

    public sealed record Stop : HostEvent;
}
