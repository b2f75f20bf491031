using System.Net;
using System.Net.Security;
using System.Net.Sockets;
using System.Security.Authentication;
using System.Security.Cryptography.X509Certificates;
using Halfvoice.Hosting;
using Halfvoice.Rig.Authority;
using Microsoft.Extensions.Time.Testing;

namespace Halfvoice.Tests.Infrastructure;

public sealed class LabAuthorityTests : IDisposable
{
    private readonly FakeTimeProvider _clock = new(new DateTimeOffset(2031, 5, 6, 7, 8, 9, TimeSpan.Zero));
    private readonly LabAuthority _authority;
    private readonly TestFolder _folder = new();

    public LabAuthorityTests() => _authority = LabAuthority.Create(TimeSpan.FromDays(365), _clock);

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Theory]
    [InlineData("upper-hydro")]
    [InlineData("Hafen Süd / Kai 3")]
    [InlineData("a:b?c#d&e=f%41")]
    [InlineData("風力")]
    public void A_site_is_recognised_by_its_exact_name(string site)
    {
        using var identity = _authority.Issue(new IdentityRequest(IdentityRole.Site, site));

        var verdict = Validator().CheckClient(identity.Certificate, PeerRole.Site);

        Assert.Equal(new PeerIdentity(PeerRole.Site, site, identity.SerialNumber), verdict.Identity);
    }

    [Theory]
    [InlineData(IdentityRole.Operator)]
    [InlineData(IdentityRole.Rig)]
    public void Operator_and_rig_are_recognised_as_clients(IdentityRole role)
    {
        using var identity = _authority.Issue(new IdentityRequest(role));

        var verdict = Validator().CheckClient(identity.Certificate, PeerRole.Operator, PeerRole.Rig);

        Assert.Equal(role.ToString(), verdict.Identity?.Role.ToString());
    }

    [Fact]
    public void A_coordinator_is_recognised_as_server_under_all_its_names()
    {
        using var identity = _authority.Issue(new IdentityRequest(IdentityRole.Coordinator)
        {
            DnsNames = ["localhost", "coordinator"],
            Addresses = [IPAddress.Loopback, IPAddress.IPv6Loopback],
        });

        Assert.Equal(PeerRole.Coordinator, Validator().CheckServer(identity.Certificate).Identity?.Role);
        Assert.All(["localhost", "coordinator", "127.0.0.1", "::1"], name => Assert.True(identity.Certificate.MatchesHostname(name)));
        Assert.False(identity.Certificate.MatchesHostname("elsewhere"));
    }

    [Fact]
    public void Serial_numbers_and_keys_are_never_the_same_twice()
    {
        var identities = Enumerable.Range(0, 50).Select(_ => _authority.Issue(new IdentityRequest(IdentityRole.Site, "one"))).ToList();

        Assert.Equal(50, identities.Select(identity => identity.SerialNumber).Distinct().Count());
        Assert.Equal(50, identities.Select(identity => Convert.ToHexString(identity.Certificate.GetPublicKey())).Distinct().Count());
        Assert.All(identities, identity => Assert.Equal(32, identity.SerialNumber.Length));
    }

    [Fact]
    public void An_identity_counts_for_thirty_days_unless_told_otherwise()
    {
        using var identity = _authority.Issue(new IdentityRequest(IdentityRole.Site, "one"));

        Assert.Equal(_clock.GetUtcNow().UtcDateTime + TimeSpan.FromDays(30), identity.Certificate.NotAfter.ToUniversalTime());
        Assert.Equal(_clock.GetUtcNow().UtcDateTime - LabAuthority.Backdating, identity.Certificate.NotBefore.ToUniversalTime());
    }

    [Fact]
    public void Requests_that_make_no_sense_are_refused()
    {
        Assert.Throws<ArgumentException>(() => _authority.Issue(new IdentityRequest(IdentityRole.Site)));
        Assert.Throws<ArgumentException>(() => _authority.Issue(new IdentityRequest(IdentityRole.Site, "")));
        Assert.Throws<ArgumentException>(() => _authority.Issue(new IdentityRequest(IdentityRole.Site, new string('x', 201))));
        Assert.Throws<ArgumentException>(() => _authority.Issue(new IdentityRequest(IdentityRole.Rig, "named")));
        Assert.Throws<ArgumentException>(() => _authority.Issue(new IdentityRequest(IdentityRole.Site, "one") { DnsNames = ["host"] }));
        var now = _clock.GetUtcNow();
        var brief = new IdentityRequest(IdentityRole.Rig) { ValidFrom = now, ValidUntil = now };
        Assert.Throws<ArgumentException>(() => _authority.Issue(brief));
    }

    [Fact]
    public void Keys_and_folders_are_readable_by_their_owner_only()
    {
        if (OperatingSystem.IsWindows())
        {
            Assert.Skip("Rights are not modes here.");
            return;
        }

        using var identity = _authority.Issue(new IdentityRequest(IdentityRole.Site, "one"));
        var folder = _folder.File("identities");
        Directory.CreateDirectory(folder, (UnixFileMode)0b111_111_111);

        var (_, keyPath) = identity.Write(folder, "one");
        identity.Write(folder, "one");

        Assert.Equal(UnixFileMode.UserRead | UnixFileMode.UserWrite | UnixFileMode.UserExecute, File.GetUnixFileMode(folder));
        Assert.Equal(UnixFileMode.UserRead | UnixFileMode.UserWrite, File.GetUnixFileMode(keyPath));
        Assert.Equal(["one.key", "one.pem"], Directory.GetFiles(folder).Select(Path.GetFileName).Order());
    }

    [Fact]
    public void Only_the_key_file_holds_a_private_key_and_both_files_belong_together()
    {
        using var identity = _authority.Issue(new IdentityRequest(IdentityRole.Site, "one"));
        var (certificatePath, keyPath) = identity.Write(_folder.Path, "one");
        _authority.WriteCertificate(_folder.File("authority.pem"));
        _authority.WriteRevocationList(_folder.File("revoked.crl"));

        using var read = X509Certificate2.CreateFromPemFile(certificatePath, keyPath);

        Assert.True(read.HasPrivateKey);
        Assert.False(_authority.Certificate.HasPrivateKey);
        var withKey = Directory.GetFiles(_folder.Path).Where(path => File.ReadAllText(path).Contains("PRIVATE"));
        Assert.Equal([keyPath], withKey);
    }

    [Fact]
    public async Task OpenSsl_accepts_what_counts_and_refuses_what_was_revoked()
    {
        OpenSsl.SkipIfAbsent();
        // Its idea of now is the real one, so this authority has the real clock.
        using var authority = LabAuthority.Create(TimeSpan.FromDays(60), TimeProvider.System);
        using var site = authority.Issue(new IdentityRequest(IdentityRole.Site, "Hafen Süd"));
        using var coordinator = authority.Issue(new IdentityRequest(IdentityRole.Coordinator) { DnsNames = ["localhost"] });
        site.Write(_folder.Path, "site");
        coordinator.Write(_folder.Path, "coordinator");
        authority.WriteCertificate(_folder.File("authority.pem"));
        authority.WriteRevocationList(_folder.File("revoked.crl"));
        string[] trust = ["-x509_strict", "-CAfile", "authority.pem", "-crl_check", "-CRLfile", "revoked.crl"];

        Assert.Equal((0, "site.pem: OK"), await VerifyAsync([.. trust, "-purpose", "sslclient", "site.pem"]));
        Assert.Equal(
            (0, "coordinator.pem: OK"),
            await VerifyAsync([.. trust, "-purpose", "sslserver", "-verify_hostname", "localhost", "coordinator.pem"]));
        Assert.NotEqual(0, (await VerifyAsync([.. trust, "-purpose", "sslserver", "site.pem"])).ExitCode);

        authority.Revoke(site.SerialNumber);
        authority.WriteRevocationList(_folder.File("revoked.crl"));

        var (exitCode, output) = await VerifyAsync([.. trust, "-purpose", "sslclient", "site.pem"]);
        Assert.NotEqual(0, exitCode);
        Assert.Contains("certificate revoked", output);
        Assert.Equal(0, (await VerifyAsync([.. trust, "-purpose", "sslserver", "coordinator.pem"])).ExitCode);

        var (_, list) = await OpenSsl.RunAsync(
            _folder.Path, Cancel, "crl", "-in", "revoked.crl", "-CAfile", "authority.pem", "-noout", "-text", "-verify");
        Assert.Contains("verify OK", list);
        Assert.Contains($"Serial Number: {site.SerialNumber}", list);
        var (_, text) = await OpenSsl.RunAsync(_folder.Path, Cancel, "x509", "-in", "site.pem", "-noout", "-text");
        Assert.Contains("URI:urn:halfvoice:site:Hafen%20S%C3%BCd", text);
    }

    [Fact]
    public async Task Two_peers_meet_over_TLS_1_3_and_know_each_other()
    {
        using var authority = LabAuthority.Create(TimeSpan.FromDays(60), TimeProvider.System);
        using var site = authority.Issue(new IdentityRequest(IdentityRole.Site, "port"));
        using var coordinator = authority.Issue(new IdentityRequest(IdentityRole.Coordinator) { DnsNames = ["localhost"] });
        var validator = ValidatorOf(authority, TimeProvider.System);

        var (server, client) = await MeetAsync(validator, coordinator, site);

        Assert.Equal("port", server.Identity?.Site);
        Assert.Equal(PeerRole.Coordinator, client.Identity?.Role);

        authority.Revoke(site.SerialNumber);
        (server, _) = await MeetAsync(ValidatorOf(authority, TimeProvider.System), coordinator, site);
        Assert.Equal(PeerRefusal.Revoked, server.Refusal);
    }

    public void Dispose()
    {
        _authority.Dispose();
        _folder.Dispose();
    }

    private static PeerValidator ValidatorOf(LabAuthority authority, TimeProvider clock)
    {
        var list = RevocationList.Read(authority.RevocationList(), authority.Certificate);
        return new PeerValidator(authority.Certificate, () => list, clock);
    }

    private PeerValidator Validator() => ValidatorOf(_authority, _clock);

    private async Task<(int ExitCode, string Output)> VerifyAsync(string[] arguments) =>
        await OpenSsl.RunAsync(_folder.Path, Cancel, ["verify", .. arguments]);

    private static async Task<(PeerVerdict Server, PeerVerdict Client)> MeetAsync(
        PeerValidator validator, IssuedIdentity coordinator, IssuedIdentity site)
    {
        PeerVerdict? serverSaw = null;
        PeerVerdict? clientSaw = null;
        using var listener = new TcpListener(IPAddress.Loopback, 0);
        listener.Start();
        var accepting = listener.AcceptTcpClientAsync(Cancel);
        using var dialled = new TcpClient();
        await dialled.ConnectAsync(IPAddress.Loopback, ((IPEndPoint)listener.LocalEndpoint).Port, Cancel);
        using var accepted = await accepting;
        await using var server = new SslStream(accepted.GetStream());
        await using var client = new SslStream(dialled.GetStream());

        // The verdicts are taken and the handshake goes on, so that both sides' verdicts can be looked at.
        await Task.WhenAll(
            server.AuthenticateAsServerAsync(
                new SslServerAuthenticationOptions
                {
                    ServerCertificate = coordinator.Certificate,
                    ClientCertificateRequired = true,
                    EnabledSslProtocols = SslProtocols.Tls13,
                    RemoteCertificateValidationCallback = (_, certificate, _, _) =>
                    {
                        serverSaw = validator.CheckClient(certificate as X509Certificate2, PeerRole.Site);
                        return serverSaw is not null;
                    },
                },
                Cancel),
            client.AuthenticateAsClientAsync(
                new SslClientAuthenticationOptions
                {
                    TargetHost = "localhost",
                    ClientCertificates = [site.Certificate],
                    EnabledSslProtocols = SslProtocols.Tls13,
                    RemoteCertificateValidationCallback = (_, certificate, _, _) =>
                    {
                        clientSaw = validator.CheckServer(certificate as X509Certificate2);
                        return clientSaw is not null;
                    },
                },
                Cancel));
        Assert.Equal(SslProtocols.Tls13, server.SslProtocol);
        return (serverSaw!, clientSaw!);
    }
}
