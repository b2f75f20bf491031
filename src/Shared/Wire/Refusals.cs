using Halfvoice.Coordination;

namespace Halfvoice.Wire;

/// <summary>Refusals on the wire; the reasons have equal numbers on both sides.</summary>
internal static class Refusals
{
    public static Refusal Read(RoundId id, V1.Refusal refusal)
    {
        var reason = Enum.IsDefined((RefusalReason)refusal.Reason) ? (RefusalReason)refusal.Reason : RefusalReason.Unspecified;
        var text = refusal.Text.Length > WireContract.MaxText ? refusal.Text[..WireContract.MaxText] : refusal.Text;
        return new Refusal(id, reason, text);
    }

    public static V1.Refusal Write(Refusal refusal) => new() { Reason = (V1.RefusalReason)refusal.Reason, Text = refusal.Text };
}
