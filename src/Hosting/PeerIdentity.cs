namespace Halfvoice.Hosting;

/// <summary>What a peer may do (design §7).</summary>
internal enum PeerRole
{
    /// <summary>Asks the sites; serves the stream.</summary>
    Coordinator,

    /// <summary>Answers for its buses.</summary>
    Site,

    /// <summary>Reads only.</summary>
    Operator,

    /// <summary>Adds annotations only.</summary>
    Rig,
}

/// <summary>Who a peer is, as its certificate says.</summary>
/// <param name="Role">Its role.</param>
/// <param name="Site">The site's name for <see cref="PeerRole.Site"/>, else null.</param>
/// <param name="SerialNumber">The certificate's serial number, upper-case hexadecimal without leading zero bytes.</param>
internal sealed record PeerIdentity(PeerRole Role, string? Site, string SerialNumber)
{
    // The names are written by LabAuthority in the rig and read here; the tests hold the two together.
    private const string Prefix = "urn:halfvoice:";
    private const string SitePrefix = Prefix + "site:";

    /// <summary>Longest site name that is accepted, characters.</summary>
    public const int LongestSiteName = 200;

    /// <summary>The URI name that stands for a role and, for a site, its name (percent-encoded).</summary>
    /// <exception cref="ArgumentException">A site without a name, a name for another role, or one that is too long.</exception>
    public static string UriOf(PeerRole role, string? site)
    {
        if (role == PeerRole.Site != !string.IsNullOrEmpty(site) || site?.Length > LongestSiteName)
        {
            throw new ArgumentException(
                $"Exactly the role 'site' has a name, of 1 to {LongestSiteName} characters.", nameof(site));
        }

        return role switch
        {
            PeerRole.Coordinator => Prefix + "coordinator",
            PeerRole.Operator => Prefix + "operator",
            PeerRole.Rig => Prefix + "rig",
            _ => SitePrefix + Uri.EscapeDataString(site!),
        };
    }

    /// <summary>Reads a URI name; null when it is none of ours or not written the one way that <see cref="UriOf"/> writes it.</summary>
    public static (PeerRole Role, string? Site)? Parse(string uri)
    {
        switch (uri)
        {
            case Prefix + "coordinator":
                return (PeerRole.Coordinator, null);
            case Prefix + "operator":
                return (PeerRole.Operator, null);
            case Prefix + "rig":
                return (PeerRole.Rig, null);
        }

        if (!uri.StartsWith(SitePrefix, StringComparison.Ordinal))
            return null;
        var site = Uri.UnescapeDataString(uri[SitePrefix.Length..]);
        if (site.Length is 0 or > LongestSiteName)
            return null;
        // One name has one spelling, so that two certificates can never claim the same site under different URIs.
        return UriOf(PeerRole.Site, site) == uri ? (PeerRole.Site, site) : null;
    }
}
