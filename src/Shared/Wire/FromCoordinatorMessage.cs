using Halfvoice.Coordination;

namespace Halfvoice.Wire;

/// <summary>A checked message from the coordinator.</summary>
public abstract record FromCoordinatorMessage
{
    private FromCoordinatorMessage()
    {
    }

    public sealed record Welcomed(Welcome Welcome) : FromCoordinatorMessage;

    public sealed record Asked(Ask Ask) : FromCoordinatorMessage;

    public sealed record Refused(Refusal Refusal) : FromCoordinatorMessage;

    public sealed record Ended(Outcome Outcome) : FromCoordinatorMessage;

    public sealed record Pulse : FromCoordinatorMessage;

    public sealed record Farewell(string Text) : FromCoordinatorMessage;
}
