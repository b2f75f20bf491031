using System.Net;
using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Rig.Authority;

namespace Halfvoice.Rig.Runs;

/// <summary>
/// Writes what each end is given before it goes live: its setup, its identity, the authority's certificate and the revocation
/// list; a site also gets its own loads and nobody else's.
/// </summary>
public sealed class BundleWriter
{
    private readonly Plan _plan;
    private readonly SetupBuilder _setups;
    private readonly LabAuthority _authority;
    private readonly DateTimeOffset? _validUntil;
    private readonly string? _coordinator;

    /// <param name="plan">A validated plan.</param>
    /// <param name="setups">Its setups.</param>
    /// <param name="authority">Issues the identities.</param>
    /// <param name="validUntil">Last moment of the identities; 30 days from now when null.</param>
    /// <param name="coordinator">HOST:PORT that sites dial; null where each agent's command line says it.</param>
    public BundleWriter(Plan plan, SetupBuilder setups, LabAuthority authority, DateTimeOffset? validUntil = null, string? coordinator = null)
    {
        _plan = plan;
        _setups = setups;
        _authority = authority;
        _validUntil = validUntil;
        _coordinator = coordinator;
    }

    /// <summary>Writes all bundles: FOLDER/coordinator and FOLDER/sites/SITE.</summary>
    /// <param name="folder">Made where needed, readable by its owner only.</param>
    /// <param name="dnsNames">Names under which sites will dial the coordinator.</param>
    /// <param name="addresses">Addresses under which sites will dial the coordinator.</param>
    public void WriteAll(string folder, IReadOnlyList<string> dnsNames, IReadOnlyList<IPAddress> addresses)
    {
        PrivateFiles.MakeFolder(folder);
        var coordinator = CoordinatorFolder(folder);
        Write(coordinator, new IdentityRequest(IdentityRole.Coordinator) { DnsNames = dnsNames, Addresses = addresses });
        PrivateFiles.Write(Path.Combine(coordinator, "coordinator.json"), SetupJson.Write(_setups.Coordinator));
        var files = PlanWriter.Write(_plan);
        PrivateFiles.MakeFolder(Path.Combine(folder, "sites"));
        foreach (var site in _plan.Network.Sites)
        {
            var own = SiteFolder(folder, site);
            Write(own, new IdentityRequest(IdentityRole.Site, site));
            PrivateFiles.Write(Path.Combine(own, "site.json"), SetupJson.Write(_setups.ForSite(site) with { Coordinator = _coordinator }));
            PrivateFiles.Write(Path.Combine(own, "loads.csv"), files.GetValueOrDefault(PlanFileRules.LoadFile(site), "bus,load_mw\n"));
        }
    }

    public static string CoordinatorFolder(string folder) => Path.Combine(folder, "coordinator");

    public static string SiteFolder(string folder, string site) => Path.Combine(folder, "sites", site);

    private void Write(string folder, IdentityRequest request)
    {
        using var identity = _authority.Issue(request with { ValidUntil = _validUntil });
        identity.Write(folder, "identity");
        _authority.WriteCertificate(Path.Combine(folder, "authority.pem"));
        _authority.WriteRevocationList(Path.Combine(folder, "revoked.crl"));
    }
}
