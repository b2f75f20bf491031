using System.Formats.Asn1;
using System.Security.Cryptography;
using System.Security.Cryptography.X509Certificates;

namespace Halfvoice.Hosting;

/// <summary>
/// Decides whether a certificate that a peer shows is one of the lab authority's, in force, not revoked, and for whom. Looks at
/// nothing but the certificate, the authority, the revocation list and the clock: no machine-wide store, no network.
/// Safe for use by several threads.
/// </summary>
/// <param name="authority">The one authority that is trusted.</param>
/// <param name="revocations">Gives the revocation list at the time of each check.</param>
/// <param name="clock">Says what time it is.</param>
internal sealed class PeerValidator(X509Certificate2 authority, Func<RevocationList> revocations, TimeProvider clock)
{
    private const string ServerUse = "1.3.6.1.5.5.7.3.1";
    private const string ClientUse = "1.3.6.1.5.5.7.3.2";
    private const string SubjectAlternativeName = "2.5.29.17";
    private static readonly Asn1Tag _uriTag = new(TagClass.ContextSpecific, 6);

    /// <summary>Checks what a client showed to us, the server.</summary>
    /// <param name="presented">The client's certificate; null when it showed none.</param>
    /// <param name="allowed">Roles that are welcome here.</param>
    public PeerVerdict CheckClient(X509Certificate2? presented, params ReadOnlySpan<PeerRole> allowed) =>
        Check(presented, ClientUse, allowed);

    /// <summary>Checks what the server that we dialled showed to us: it must be the coordinator.</summary>
    public PeerVerdict CheckServer(X509Certificate2? presented) => Check(presented, ServerUse, [PeerRole.Coordinator]);

    private PeerVerdict Check(X509Certificate2? presented, string use, ReadOnlySpan<PeerRole> allowed)
    {
        if (presented is null)
            return PeerVerdict.Refuse(PeerRefusal.NoCertificate, "The peer showed no certificate.");
        var now = clock.GetUtcNow();
        return CheckChain(presented, now)
            ?? CheckValidity(presented, now)
            ?? CheckRevocation(presented, now)
            ?? CheckUse(presented, use)
            ?? Identify(presented, allowed);
    }

    private PeerVerdict? CheckChain(X509Certificate2 presented, DateTimeOffset now)
    {
        using var chain = new X509Chain();
        var policy = chain.ChainPolicy;
        policy.TrustMode = X509ChainTrustMode.CustomRootTrust;
        policy.CustomTrustStore.Add(authority);
        policy.RevocationMode = X509RevocationMode.NoCheck;
        policy.DisableCertificateDownloads = true;
        policy.VerificationTimeIgnored = false;
        policy.VerificationTime = now.UtcDateTime;
        // Times are compared below, where an expired certificate can be told from one of the future.
        policy.VerificationFlags = X509VerificationFlags.IgnoreNotTimeValid | X509VerificationFlags.IgnoreCtlNotTimeValid;
        var holds = chain.Build(presented);
        // The authority issues directly: a chain of any other length rests on something that it did not hand out as an identity.
        if (holds && chain.ChainElements.Count == 2
            && chain.ChainElements[1].Certificate.RawDataMemory.Span.SequenceEqual(authority.RawDataMemory.Span))
        {
            return null;
        }

        return PeerVerdict.Refuse(
            PeerRefusal.UnknownAuthority,
            $"The certificate with serial {SerialOf(presented)} was not issued by this rehearsal's authority. " +
            "Use the identity files of the same run.");
    }

    private PeerVerdict? CheckValidity(X509Certificate2 presented, DateTimeOffset now)
    {
        foreach (var (certificate, what) in new[] { (presented, "The certificate"), (authority, "The authority's certificate") })
        {
            var first = new DateTimeOffset(certificate.NotBefore.ToUniversalTime());
            var last = new DateTimeOffset(certificate.NotAfter.ToUniversalTime());
            if (now > last)
            {
                return PeerVerdict.Refuse(
                    PeerRefusal.Expired, $"{what} expired at {last:u}; it is {now:u} here. Issue a new one, or check this clock.");
            }

            if (now < first)
            {
                return PeerVerdict.Refuse(
                    PeerRefusal.NotYetValid, $"{what} is valid from {first:u}; it is {now:u} here. Check both clocks.");
            }
        }

        return null;
    }

    private PeerVerdict? CheckRevocation(X509Certificate2 presented, DateTimeOffset now)
    {
        var list = revocations();
        if (list.Fault is { } fault)
            return PeerVerdict.Refuse(PeerRefusal.RevocationListInvalid, $"The revocation list does not hold: {fault}.");
        if (now < list.ThisUpdate || now > list.NextUpdate)
        {
            return PeerVerdict.Refuse(
                PeerRefusal.RevocationListInvalid,
                $"The revocation list counts from {list.ThisUpdate:u} to {list.NextUpdate:u}; it is {now:u} here. " +
                "Write a new list, or check this clock.");
        }

        return list.Contains(presented.SerialNumberBytes.Span)
            ? PeerVerdict.Refuse(PeerRefusal.Revoked, $"The certificate with serial {SerialOf(presented)} is revoked.")
            : null;
    }

    private static PeerVerdict? CheckUse(X509Certificate2 presented, string use)
    {
        var uses = presented.Extensions.OfType<X509EnhancedKeyUsageExtension>()
            .SelectMany(extension => extension.EnhancedKeyUsages.Cast<Oid>());
        return uses.Any(oid => oid.Value == use)
            ? null
            : PeerVerdict.Refuse(
                PeerRefusal.WrongUse,
                use == ServerUse ? "The certificate is not one for a server." : "The certificate is not one for a client.");
    }

    private static PeerVerdict Identify(X509Certificate2 presented, ReadOnlySpan<PeerRole> allowed)
    {
        var names = UriNames(presented);
        if (names is not [var only] || PeerIdentity.Parse(only) is not { } known)
        {
            return PeerVerdict.Refuse(
                PeerRefusal.NoIdentity, $"The certificate must have exactly one URI name, and one that says a role; it has {names.Count}.");
        }

        return allowed.Contains(known.Role)
            ? PeerVerdict.Accept(new PeerIdentity(known.Role, known.Site, SerialOf(presented)))
            : PeerVerdict.Refuse(PeerRefusal.WrongRole, $"The role '{known.Role}' has no business here.");
    }

    /// <summary>All URI names of the certificate; a name that is damaged counts as one that says nothing.</summary>
    private static List<string> UriNames(X509Certificate2 presented)
    {
        List<string> names = [];
        foreach (var extension in presented.Extensions)
        {
            if (extension.Oid?.Value != SubjectAlternativeName)
                continue;
            try
            {
                // SubjectAltName ::= SEQUENCE OF GeneralName, where uniformResourceIdentifier is [6] IA5String
                var reader = new AsnReader(extension.RawData, AsnEncodingRules.DER).ReadSequence();
                while (reader.HasData)
                {
                    if (reader.PeekTag().HasSameClassAndValue(_uriTag))
                        names.Add(reader.ReadCharacterString(UniversalTagNumber.IA5String, _uriTag));
                    else
                        reader.ReadEncodedValue();
                }
            }
            catch (AsnContentException)
            {
                names.Add("");
            }
        }

        return names;
    }

    private static string SerialOf(X509Certificate2 certificate) =>
        Convert.ToHexString(certificate.SerialNumberBytes.Span.TrimStart((byte)0));
}
