using System.Security.Cryptography.X509Certificates;
using Halfvoice.Hosting;

namespace Halfvoice.Benchmarks.BareExchange;

/// <summary>The certificate files of a run: authority.pem, revoked.crl, and NAME.pem with NAME.key for everybody.</summary>
internal static class Identities
{
    public static X509Certificate2 Load(string folder, string name) =>
        X509Certificate2.CreateFromPemFile(Path.Combine(folder, name + ".pem"), Path.Combine(folder, name + ".key"));

    public static PeerValidator Validator(string folder)
    {
        var authority = X509CertificateLoader.LoadCertificateFromFile(Path.Combine(folder, "authority.pem"));
        var list = new RevocationListFile(Path.Combine(folder, "revoked.crl"), authority);
        return new PeerValidator(authority, () => list.Current, TimeProvider.System);
    }
}
