using System.Net;

namespace Halfvoice.Rig.Authority;

/// <summary>What an identity shall say.</summary>
/// <param name="Role">The role.</param>
/// <param name="Site">The site's name, 1 to 200 characters; null for every other role.</param>
public sealed record IdentityRequest(IdentityRole Role, string? Site = null)
{
    /// <summary>How long it counts when nothing is said.</summary>
    public static readonly TimeSpan DefaultValidity = TimeSpan.FromDays(30);

    /// <summary>
    /// First moment of validity; the authority's own first moment when null, a few minutes ago, so that a peer whose clock is a
    /// little behind accepts it. Moments of the past and the future are allowed: rehearsals need expired and early certificates.
    /// </summary>
    public DateTimeOffset? ValidFrom { get; init; }

    /// <summary>Last moment of validity; 30 days from now when null, cut to the authority's own.</summary>
    public DateTimeOffset? ValidUntil { get; init; }

    /// <summary>Host names under which a coordinator is dialled; empty for other roles.</summary>
    public IReadOnlyList<string> DnsNames { get; init; } = [];

    /// <summary>Addresses under which a coordinator is dialled; empty for other roles.</summary>
    public IReadOnlyList<IPAddress> Addresses { get; init; } = [];
}
