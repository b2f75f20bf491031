using System.Formats.Asn1;
using System.Security.Cryptography;
using System.Security.Cryptography.X509Certificates;

namespace Halfvoice.Tests.Infrastructure;

/// <summary>An authority that signs anything, for certificates and lists that the lab authority would never make.</summary>
internal sealed class HandmadeAuthority : IDisposable
{
    public const string ClientUse = "1.3.6.1.5.5.7.3.2";

    private static readonly DateTimeOffset _from = new(2031, 1, 1, 0, 0, 0, TimeSpan.Zero);

    public HandmadeAuthority(string name = "CN=Handmade")
    {
        var request = new CertificateRequest(name, Key, HashAlgorithmName.SHA256);
        request.CertificateExtensions.Add(new X509BasicConstraintsExtension(true, false, 0, true));
        request.CertificateExtensions.Add(new X509SubjectKeyIdentifierExtension(request.PublicKey, false));
        WithKey = request.CreateSelfSigned(_from, _from.AddYears(1));
        Certificate = X509CertificateLoader.LoadCertificate(WithKey.RawData);
    }

    public ECDsa Key { get; } = ECDsa.Create(ECCurve.NamedCurves.nistP256);

    public X509Certificate2 Certificate { get; }

    public X509Certificate2 WithKey { get; }

    /// <summary>Signs a certificate for a client with these extensions besides; <paramref name="key"/> is the subject's.</summary>
    public X509Certificate2 Sign(ECDsa key, params X509Extension[] extensions)
    {
        var request = new CertificateRequest("CN=any", key, HashAlgorithmName.SHA256);
        request.CertificateExtensions.Add(new X509EnhancedKeyUsageExtension([new Oid(ClientUse)], false));
        foreach (var extension in extensions)
            request.CertificateExtensions.Add(extension);
        var signer = X509SignatureGenerator.CreateForECDsa(Key);
        return request.Create(Certificate.SubjectName, signer, _from, _from.AddYears(1), RandomNumberGenerator.GetBytes(8));
    }

    public static X509Extension Uris(params string[] uris)
    {
        var names = new SubjectAlternativeNameBuilder();
        foreach (var uri in uris)
            names.AddUri(new Uri(uri));
        return names.Build();
    }

    /// <summary>A signed list that is written out by hand, entry by entry, with one extension of a choosable kind.</summary>
    public byte[] List(DateTimeOffset thisUpdate, DateTimeOffset? nextUpdate, string extension, bool isCritical, params byte[][] serials)
    {
        var body = new AsnWriter(AsnEncodingRules.DER);
        using (body.PushSequence())
        {
            body.WriteInteger(1);
            WriteAlgorithm(body);
            body.WriteEncodedValue(Certificate.SubjectName.RawData);
            body.WriteUtcTime(thisUpdate);
            if (nextUpdate is { } next)
                body.WriteGeneralizedTime(next, omitFractionalSeconds: true);
            WriteEntries(body, thisUpdate, serials);
            using (body.PushSequence(new Asn1Tag(TagClass.ContextSpecific, 0)))
            using (body.PushSequence())
            using (body.PushSequence())
            {
                body.WriteObjectIdentifier(extension);
                if (isCritical)
                    body.WriteBoolean(true);
                body.WriteOctetString([2, 1, 1]);
            }
        }

        var signed = body.Encode();
        var list = new AsnWriter(AsnEncodingRules.DER);
        using (list.PushSequence())
        {
            list.WriteEncodedValue(signed);
            WriteAlgorithm(list);
            list.WriteBitString(Key.SignData(signed, HashAlgorithmName.SHA256, DSASignatureFormat.Rfc3279DerSequence));
        }

        return list.Encode();
    }

    public void Dispose()
    {
        Certificate.Dispose();
        WithKey.Dispose();
        Key.Dispose();
    }

    private static void WriteEntries(AsnWriter body, DateTimeOffset when, byte[][] serials)
    {
        if (serials.Length == 0)
            return;
        using (body.PushSequence())
        {
            foreach (var serial in serials)
            {
                using (body.PushSequence())
                {
                    body.WriteIntegerUnsigned(serial);
                    body.WriteUtcTime(when);
                }
            }
        }
    }

    private static void WriteAlgorithm(AsnWriter writer)
    {
        using (writer.PushSequence())
            writer.WriteObjectIdentifier("1.2.840.10045.4.3.2");
    }
}
