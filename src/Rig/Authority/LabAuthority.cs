using System.Security.Cryptography;
using System.Security.Cryptography.X509Certificates;
using Halfvoice.Hosting;

namespace Halfvoice.Rig.Authority;

/// <summary>
/// The rehearsal's own certificate authority: ECDSA on P-256 with SHA-256, certificates by RFC 5280. Its private key lives in
/// memory only and goes with the rig, so that nobody can issue an identity for a run that is over.
/// </summary>
/// <remarks>Not safe for use by several threads.</remarks>
public sealed class LabAuthority : IDisposable
{
    /// <summary>Certificates and lists count from this much before now, for peers whose clock is a little behind.</summary>
    public static readonly TimeSpan Backdating = TimeSpan.FromMinutes(5);

    private const string ServerUse = "1.3.6.1.5.5.7.3.1";
    private const string ClientUse = "1.3.6.1.5.5.7.3.2";

    private readonly TimeProvider _clock;
    private readonly X509Certificate2 _withKey;
    private readonly CertificateRevocationListBuilder _revoked = new();
    private readonly HashSet<string> _revokedSerials = [];
    private int _listNumber;

    private LabAuthority(X509Certificate2 withKey, TimeProvider clock)
    {
        _withKey = withKey;
        _clock = clock;
        Certificate = X509CertificateLoader.LoadCertificate(withKey.RawData);
    }

    /// <summary>The authority's certificate, without its key: what every peer trusts.</summary>
    public X509Certificate2 Certificate { get; }

    /// <summary>Makes a new authority.</summary>
    /// <param name="validFor">From now; above 0, at most 20 years.</param>
    /// <param name="clock">Says what time it is.</param>
    public static LabAuthority Create(TimeSpan validFor, TimeProvider clock)
    {
        ArgumentNullException.ThrowIfNull(clock);
        ArgumentOutOfRangeException.ThrowIfLessThanOrEqual(validFor, TimeSpan.Zero);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(validFor, TimeSpan.FromDays(20 * 366));
        using var key = ECDsa.Create(ECCurve.NamedCurves.nistP256);
        // The name is unique, so that files of two runs can never be taken for each other.
        var name = $"CN=Halfvoice lab authority {RandomNumberGenerator.GetHexString(16, lowercase: true)}";
        var request = new CertificateRequest(name, key, HashAlgorithmName.SHA256);
        request.CertificateExtensions.Add(new X509BasicConstraintsExtension(true, true, 0, true));
        request.CertificateExtensions.Add(new X509KeyUsageExtension(X509KeyUsageFlags.KeyCertSign | X509KeyUsageFlags.CrlSign, true));
        request.CertificateExtensions.Add(new X509SubjectKeyIdentifierExtension(request.PublicKey, false));
        var now = clock.GetUtcNow();
        return new LabAuthority(request.CreateSelfSigned(now - Backdating, now + validFor), clock);
    }

    /// <summary>Issues an identity with a new key and a random serial number.</summary>
    /// <exception cref="ArgumentException">A site without a name, a name on another role, host names on a client, an empty validity.</exception>
    public IssuedIdentity Issue(IdentityRequest request)
    {
        ArgumentNullException.ThrowIfNull(request);
        var isServer = request.Role == IdentityRole.Coordinator;
        if (!isServer && request.DnsNames.Count + request.Addresses.Count > 0)
            throw new ArgumentException("Only a coordinator is dialled, so only it has host names and addresses.", nameof(request));
        var from = request.ValidFrom ?? AuthorityFrom;
        var until = request.ValidUntil ?? Earlier(_clock.GetUtcNow() + IdentityRequest.DefaultValidity, AuthorityUntil);
        if (until <= from)
            throw new ArgumentException($"The validity from {from:u} to {until:u} is empty.", nameof(request));

        using var key = ECDsa.Create(ECCurve.NamedCurves.nistP256);
        // The subject is for people; the identity is the URI name. A site's name may hold what a subject cannot, so it stays out.
        var certificateRequest = new CertificateRequest($"CN=Halfvoice {request.Role}", key, HashAlgorithmName.SHA256);
        AddExtensions(certificateRequest, request, isServer);
        // CertificateRequest.Create refuses a validity that ends after the authority's or starts before it, but rehearsals need
        // exactly such certificates; a generator of our own key signs without that opinion.
        using var authorityKey = _withKey.GetECDsaPrivateKey()!;
        var signer = X509SignatureGenerator.CreateForECDsa(authorityKey);
        using var bare = certificateRequest.Create(Certificate.SubjectName, signer, from, until, NewSerialNumber());
        return new IssuedIdentity(bare.CopyWithPrivateKey(key));
    }

    /// <summary>Puts a serial number on the list, once. Takes effect with the next list written.</summary>
    /// <param name="serialNumber">Hexadecimal, as <see cref="IssuedIdentity.SerialNumber"/> gives it.</param>
    public void Revoke(string serialNumber)
    {
        ArgumentException.ThrowIfNullOrEmpty(serialNumber);
        if (_revokedSerials.Add(serialNumber.ToUpperInvariant()))
            _revoked.AddEntry(Convert.FromHexString(serialNumber), _clock.GetUtcNow(), X509RevocationReason.KeyCompromise);
    }

    /// <summary>Signs the revocation list as of now, DER; it counts as long as the authority does.</summary>
    public byte[] RevocationList()
    {
        var now = _clock.GetUtcNow();
        return _revoked.Build(_withKey, ++_listNumber, AuthorityUntil, HashAlgorithmName.SHA256, null, now - Backdating);
    }

    /// <summary>Writes the revocation list of now, PEM, as a whole in place of any former one.</summary>
    public void WriteRevocationList(string path) =>
        PrivateFiles.Write(path, PemEncoding.WriteString("X509 CRL", RevocationList()) + "\n");

    /// <summary>Writes the authority's certificate, PEM; it holds no secret.</summary>
    public void WriteCertificate(string path) => PrivateFiles.Write(path, Certificate.ExportCertificatePem() + "\n");

    public void Dispose()
    {
        Certificate.Dispose();
        _withKey.Dispose();
    }

    private DateTimeOffset AuthorityFrom => new(Certificate.NotBefore.ToUniversalTime());

    private DateTimeOffset AuthorityUntil => new(Certificate.NotAfter.ToUniversalTime());

    private static DateTimeOffset Earlier(DateTimeOffset a, DateTimeOffset b) => a < b ? a : b;

    private void AddExtensions(CertificateRequest certificateRequest, IdentityRequest request, bool isServer)
    {
        var names = new SubjectAlternativeNameBuilder();
        names.AddUri(new Uri(PeerIdentity.UriOf(ToPeerRole(request.Role), request.Site)));
        foreach (var name in request.DnsNames)
            names.AddDnsName(name);
        foreach (var address in request.Addresses)
            names.AddIpAddress(address);
        var extensions = certificateRequest.CertificateExtensions;
        extensions.Add(new X509BasicConstraintsExtension(false, false, 0, true));
        extensions.Add(new X509KeyUsageExtension(X509KeyUsageFlags.DigitalSignature, true));
        extensions.Add(new X509EnhancedKeyUsageExtension([new Oid(isServer ? ServerUse : ClientUse)], true));
        extensions.Add(names.Build());
        extensions.Add(new X509SubjectKeyIdentifierExtension(certificateRequest.PublicKey, false));
        extensions.Add(X509AuthorityKeyIdentifierExtension.CreateFromCertificate(Certificate, true, false));
    }

    private static PeerRole ToPeerRole(IdentityRole role) => role switch
    {
        IdentityRole.Coordinator => PeerRole.Coordinator,
        IdentityRole.Site => PeerRole.Site,
        IdentityRole.Operator => PeerRole.Operator,
        _ => PeerRole.Rig,
    };

    /// <summary>16 random bytes, positive and without a leading zero byte (RFC 5280 section 4.1.2.2 allows up to 20).</summary>
    private static byte[] NewSerialNumber()
    {
        var serial = RandomNumberGenerator.GetBytes(16);
        serial[0] = (byte)((serial[0] & 0x3F) | 0x40);
        return serial;
    }
}
