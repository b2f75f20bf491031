namespace Halfvoice.Rig.Authority;

/// <summary>Roles that the lab authority issues identities for (design §7).</summary>
public enum IdentityRole
{
    /// <summary>Serves the stream; its certificate is one for a server.</summary>
    Coordinator,

    /// <summary>One site; has a name.</summary>
    Site,

    /// <summary>Reads only.</summary>
    Operator,

    /// <summary>Adds annotations only.</summary>
    Rig,
}
