namespace Halfvoice.Hosting;

/// <summary>Why a peer's certificate is refused.</summary>
internal enum PeerRefusal
{
    /// <summary>The peer showed no certificate.</summary>
    NoCertificate,

    /// <summary>Not signed by the lab authority, or altered.</summary>
    UnknownAuthority,

    /// <summary>The certificate, or the authority's own, is past its last day.</summary>
    Expired,

    /// <summary>The certificate, or the authority's own, is before its first day.</summary>
    NotYetValid,

    /// <summary>On the revocation list.</summary>
    Revoked,

    /// <summary>No readable, authentic and current revocation list: whether the certificate still counts cannot be known.</summary>
    RevocationListInvalid,

    /// <summary>A client's certificate shown by a server, or the other way round.</summary>
    WrongUse,

    /// <summary>No URI name of ours, or several.</summary>
    NoIdentity,

    /// <summary>A valid identity whose role has no business here.</summary>
    WrongRole,
}

/// <summary>Either the identity that was accepted or the reason for the refusal, and a sentence for the log.</summary>
/// <param name="Identity">Who it is; null when refused.</param>
/// <param name="Refusal">Why not; null when accepted.</param>
/// <param name="Explanation">What was wrong and what to do about it; empty when accepted.</param>
internal sealed record PeerVerdict(PeerIdentity? Identity, PeerRefusal? Refusal, string Explanation)
{
    public bool IsAccepted => Identity is not null;

    public static PeerVerdict Accept(PeerIdentity identity) => new(identity, null, "");

    public static PeerVerdict Refuse(PeerRefusal reason, string explanation) => new(null, reason, explanation);
}
