using System.Formats.Asn1;
using System.Numerics;
using System.Security.Cryptography;
using System.Security.Cryptography.X509Certificates;

namespace Halfvoice.Hosting;

/// <summary>
/// The lab authority's revocation list (RFC 5280 section 5, from memory), checked for its signature. The platform's own chain
/// check fetches lists over the network or from a machine-wide store; ours is a file, so it is read here.
/// </summary>
internal sealed class RevocationList
{
    /// <summary>Largest list that is read, bytes; some 400,000 entries.</summary>
    public const int LargestBytes = 16 << 20;

    private const string EcdsaWithSha256 = "1.2.840.10045.4.3.2";
    private const string AuthorityKeyIdentifier = "2.5.29.35";
    private const string ListNumber = "2.5.29.20";
    private const string ReasonCode = "2.5.29.21";
    private const string InvalidityDate = "2.5.29.24";
    private static readonly Asn1Tag _extensionsTag = new(TagClass.ContextSpecific, 0);

    private readonly HashSet<BigInteger> _serials = [];

    private RevocationList(string fault) => Fault = fault;

    /// <summary>What is wrong with the list; null when its signature and form hold.</summary>
    public string? Fault { get; private init; }

    /// <summary>When the list was made.</summary>
    public DateTimeOffset ThisUpdate { get; private set; }

    /// <summary>When a newer one is due at the latest; null when the list does not say.</summary>
    public DateTimeOffset? NextUpdate { get; private set; }

    /// <summary>Number of revoked certificates.</summary>
    public int Count => _serials.Count;

    /// <summary>True when this serial number is revoked.</summary>
    /// <param name="serialNumber">As <see cref="X509Certificate.SerialNumberBytes"/> gives it, big-endian.</param>
    public bool Contains(ReadOnlySpan<byte> serialNumber) => _serials.Contains(Unsigned(serialNumber));

    /// <summary>A list that could not even be read; everything checked against it is refused.</summary>
    public static RevocationList Unreadable(string fault) => new(fault);

    /// <summary>Reads a list, PEM ("X509 CRL") or DER, and checks that the authority signed it. Never throws for bad content.</summary>
    /// <param name="content">The file's bytes.</param>
    /// <param name="authority">The lab authority's certificate, ECDSA on P-256.</param>
    public static RevocationList Read(ReadOnlySpan<byte> content, X509Certificate2 authority)
    {
        ArgumentNullException.ThrowIfNull(authority);
        if (content.Length > LargestBytes)
            return Unreadable($"it has {content.Length} bytes; {LargestBytes} are the limit");
        try
        {
            var list = new RevocationList("") { Fault = null };
            var fault = list.Decode(Unwrap(content), authority);
            return fault is null ? list : Unreadable(fault);
        }
        catch (Exception malformed) when (malformed is AsnContentException or CryptographicException or FormatException)
        {
            return Unreadable("it is no certificate revocation list, or a damaged one");
        }
    }

    private static byte[] Unwrap(ReadOnlySpan<byte> content)
    {
        if (!content.StartsWith("-----BEGIN"u8))
            return content.ToArray();
        var text = System.Text.Encoding.ASCII.GetString(content);
        if (!PemEncoding.TryFind(text, out var fields) || text[fields.Label] != "X509 CRL")
            throw new FormatException("No PEM, or another kind of it.");
        return Convert.FromBase64String(text[fields.Base64Data]);
    }

    private string? Decode(byte[] der, X509Certificate2 authority)
    {
        // CertificateList ::= SEQUENCE { tbsCertList, signatureAlgorithm, signature BIT STRING }
        var outer = new AsnReader(der, AsnEncodingRules.DER);
        var list = outer.ReadSequence();
        outer.ThrowIfNotEmpty();
        var signed = list.PeekEncodedValue();
        var body = list.ReadSequence();
        var algorithm = list.ReadSequence().ReadObjectIdentifier();
        var signature = list.ReadBitString(out _);
        list.ThrowIfNotEmpty();

        if (algorithm != EcdsaWithSha256)
            return "it is signed with a method other than ECDSA with SHA-256";
        using var key = authority.GetECDsaPublicKey();
        if (key is null || !key.VerifyData(signed.Span, signature, HashAlgorithmName.SHA256, DSASignatureFormat.Rfc3279DerSequence))
            return "the lab authority did not sign it";
        return DecodeBody(body, authority);
    }

    private string? DecodeBody(AsnReader body, X509Certificate2 authority)
    {
        // tbsCertList: version 2 (encoded 1), signature, issuer, thisUpdate, nextUpdate?, revokedCertificates?, [0] extensions?
        if (body.ReadInteger() != 1)
            return "it is not of version 2";
        if (body.ReadSequence().ReadObjectIdentifier() != EcdsaWithSha256)
            return "it names two different signature methods";
        if (!body.ReadEncodedValue().Span.SequenceEqual(authority.SubjectName.RawData))
            return "it names another authority";
        ThisUpdate = ReadTime(body);
        if (body.HasData && IsTime(body.PeekTag()))
            NextUpdate = ReadTime(body);
        if (body.HasData && body.PeekTag() == Asn1Tag.Sequence)
        {
            var entries = body.ReadSequence();
            while (entries.HasData)
            {
                if (ReadEntry(entries.ReadSequence()) is { } fault)
                    return fault;
            }
        }

        var unknown = body.HasData
            ? UnknownCriticalExtension(body.ReadSequence(_extensionsTag).ReadSequence(), AuthorityKeyIdentifier, ListNumber)
            : null;
        body.ThrowIfNotEmpty();
        return unknown;
    }

    private string? ReadEntry(AsnReader entry)
    {
        _serials.Add(Unsigned(entry.ReadIntegerBytes().Span));
        _ = ReadTime(entry);
        return entry.HasData ? UnknownCriticalExtension(entry.ReadSequence(), ReasonCode, InvalidityDate) : null;
    }

    // Encodings differ in whether a leading zero byte keeps the sign; serial numbers have none.
    private static BigInteger Unsigned(ReadOnlySpan<byte> bytes) => new(bytes, isUnsigned: true, isBigEndian: true);

    /// <summary>A critical extension that we do not know may change what the whole list means (a partial list, say): refuse it.</summary>
    private static string? UnknownCriticalExtension(AsnReader extensions, params ReadOnlySpan<string> known)
    {
        while (extensions.HasData)
        {
            var extension = extensions.ReadSequence();
            var kind = extension.ReadObjectIdentifier();
            var isCritical = extension.PeekTag() == Asn1Tag.Boolean && extension.ReadBoolean();
            if (isCritical && !known.Contains(kind))
                return $"it has an unknown critical extension ({kind})";
        }

        return null;
    }

    private static bool IsTime(Asn1Tag tag) => tag == Asn1Tag.UtcTime || tag == Asn1Tag.GeneralizedTime;

    private static DateTimeOffset ReadTime(AsnReader reader) =>
        reader.PeekTag() == Asn1Tag.UtcTime ? reader.ReadUtcTime() : reader.ReadGeneralizedTime();
}
