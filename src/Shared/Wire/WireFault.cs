using Halfvoice.Coordination;

namespace Halfvoice.Wire;

/// <summary>What is wrong with a message that came in. The text names the field and the rule, never a value.</summary>
public sealed record WireFault(RefusalReason Reason, string Text)
{
    public Refusal At(RoundId id) => new(id, Reason, Text);
}
