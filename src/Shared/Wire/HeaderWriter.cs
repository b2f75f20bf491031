using Halfvoice.Coordination;

namespace Halfvoice.Wire;

/// <summary>Numbers outgoing messages of one stream.</summary>
internal sealed class HeaderWriter
{
    private ulong _sequence;

    public V1.Header Next(RoundId id) => new()
    {
        Protocol = WireContract.Protocol,
        Cycle = (uint)id.Cycle,
        Round = (uint)id.Round,
        Sequence = ++_sequence,
    };
}
