using Halfvoice.Privacy;

namespace Halfvoice.Coordination;

/// <summary>What may happen to a site. One door: <see cref="SiteCore.Step"/>.</summary>
public abstract record SiteInput
{
    private SiteInput()
    {
    }

    public sealed record Welcomed(Welcome Welcome) : SiteInput;

    public sealed record Asked(Ask Ask) : SiteInput;

    public sealed record Ended(Outcome Outcome) : SiteInput;

    /// <summary>The host stops in good order: what was reserved and not used goes back.</summary>
    public sealed record Stopping : SiteInput;
}

/// <summary>What the host must do, in this order: store all of the rows durably, then send the reply.</summary>
public sealed class SiteStep
{
    /// <summary>Ledger rows to insert or replace by their id; durable before <see cref="Reply"/> leaves.</summary>
    public List<ChargeRow> Charges { get; } = [];

    /// <summary>Set-points that a cycle left; shadow mode: they are stored and written nowhere else.</summary>
    public List<SetPoint> SetPoints { get; } = [];

    /// <summary>At most one message.</summary>
    public SiteReply? Reply { get; internal set; }

    internal void Clear()
    {
        Charges.Clear();
        SetPoints.Clear();
        Reply = null;
    }
}

/// <summary>What a site sends back.</summary>
public abstract record SiteReply
{
    private SiteReply()
    {
    }

    public sealed record Answered(Answer Answer) : SiteReply;

    public sealed record Refused(Refusal Refusal) : SiteReply;
}

/// <summary>A plant's set-point after a cycle. Private to the site.</summary>
/// <param name="Accepted">False where the cycle did not settle: the last accepted set-point stands and this one is a record only.</param>
public sealed record SetPoint(int Cycle, string Generator, double Mw, bool Accepted);

/// <summary>Where a site's loads come from.</summary>
public interface ILoadReadings
{
    /// <summary>Reads the loads of a cycle, MW, in the order of the site's buses; false where there is no reading.</summary>
    bool TryRead(int cycle, Span<double> loadMw);
}
