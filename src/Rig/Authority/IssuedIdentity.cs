using System.Security.Cryptography.X509Certificates;

namespace Halfvoice.Rig.Authority;

/// <summary>A certificate with its private key, fresh from the authority.</summary>
public sealed class IssuedIdentity : IDisposable
{
    internal IssuedIdentity(X509Certificate2 certificate) => Certificate = certificate;

    /// <summary>The certificate, with its private key.</summary>
    public X509Certificate2 Certificate { get; }

    /// <summary>Serial number, upper-case hexadecimal.</summary>
    public string SerialNumber => Certificate.SerialNumber;

    /// <summary>
    /// Writes <c>NAME.pem</c> and <c>NAME.key</c> (PKCS #8) into a private folder, which is made where needed.
    /// </summary>
    /// <param name="folder">Gets mode 0700.</param>
    /// <param name="name">File name without ending.</param>
    /// <returns>The two paths.</returns>
    public (string CertificatePath, string KeyPath) Write(string folder, string name)
    {
        PrivateFiles.MakeFolder(folder);
        var certificatePath = Path.Combine(folder, name + ".pem");
        var keyPath = Path.Combine(folder, name + ".key");
        PrivateFiles.Write(certificatePath, Certificate.ExportCertificatePem() + "\n");
        using var key = Certificate.GetECDsaPrivateKey()!;
        PrivateFiles.Write(keyPath, key.ExportPkcs8PrivateKeyPem() + "\n");
        return (certificatePath, keyPath);
    }

    public void Dispose() => Certificate.Dispose();
}
