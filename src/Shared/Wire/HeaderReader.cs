using Halfvoice.Coordination;

namespace Halfvoice.Wire;

/// <summary>Checks the headers of incoming messages of one stream: version, order without gaps or repeats.</summary>
internal sealed class HeaderReader
{
    private ulong _sequence;

    /// <returns>Null when all is well. A repeated or skipped message is refused and leaves the expected number as it was.</returns>
    public WireFault? Check(V1.Header? header)
    {
        if (header is null)
            return new WireFault(RefusalReason.Malformed, "The message has no header.");
        if (header.Protocol != WireContract.Protocol)
            return new WireFault(RefusalReason.NotOurPlan, $"This end speaks protocol version {WireContract.Protocol}.");
        if (header.Sequence != _sequence + 1)
            return new WireFault(RefusalReason.OutOfOrder, "The message's sequence number is not the next one.");
        if (header.Cycle > int.MaxValue || header.Round > int.MaxValue)
            return new WireFault(RefusalReason.OutOfRange, "A cycle or round is beyond any plan.");
        _sequence++;
        return null;
    }

    public static RoundId IdOf(V1.Header header) => new((int)header.Cycle, (int)header.Round);
}
