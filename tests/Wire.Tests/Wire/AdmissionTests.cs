using System.Net.Security;
using System.Net.Sockets;
using System.Security.Authentication;
using System.Security.Cryptography.X509Certificates;
using Grpc.Core;
using Halfvoice.Rig.Authority;
using Halfvoice.Rig.Runs;
using Halfvoice.Tests.Infrastructure;
using Halfvoice.Tests.Rehearsals;

namespace Halfvoice.Tests.Wire;

/// <summary>Who does not get in, how that is told, and that the others do not notice.</summary>
[Collection(RealProcesses.Name)]
public sealed class AdmissionTests
{
    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Fact]
    public async Task Strangers_are_refused_with_typed_reasons_and_the_cycle_of_the_others_settles()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents("mid");

        using var otherAuthority = LabAuthority.Create(TimeSpan.FromDays(1), TimeProvider.System);
        using var foreign = otherAuthority.Issue(new IdentityRequest(IdentityRole.Site, "mid"));
        await AssertNotConnectedAsync(lab, coordinator, foreign.Certificate, "UnknownAuthority");

        var now = TimeProvider.System.GetUtcNow();
        using var expired = lab.Authority.Issue(new IdentityRequest(IdentityRole.Site, "mid") { ValidFrom = now.AddDays(-2), ValidUntil = now.AddDays(-1) });
        await AssertNotConnectedAsync(lab, coordinator, expired.Certificate, "Expired");
        using var early = lab.Authority.Issue(new IdentityRequest(IdentityRole.Site, "mid") { ValidFrom = now.AddDays(1), ValidUntil = now.AddDays(2) });
        await AssertNotConnectedAsync(lab, coordinator, early.Certificate, "NotYetValid");
        using var server = lab.Authority.Issue(new IdentityRequest(IdentityRole.Coordinator) { DnsNames = ["localhost"] });
        await AssertNotConnectedAsync(lab, coordinator, server.Certificate, "WrongUse");
        await AssertNotConnectedAsync(lab, coordinator, null, null);

        using var revoked = lab.Authority.Issue(new IdentityRequest(IdentityRole.Site, "mid"));
        lab.Authority.Revoke(revoked.SerialNumber);
        lab.Authority.WriteRevocationList(Path.Combine(BundleWriter.CoordinatorFolder(lab.Bundles), "revoked.crl"));
        await AssertNotConnectedAsync(lab, coordinator, revoked.Certificate, "Revoked");

        foreach (var role in new[] { IdentityRole.Operator, IdentityRole.Rig })
        {
            using var other = lab.Authority.Issue(new IdentityRequest(role));
            await AssertNotJoinedAsync(lab, coordinator, other.Certificate, "WrongRole");
        }

        using var unknown = lab.Authority.Issue(new IdentityRequest(IdentityRole.Site, "nowhere"));
        await AssertNotJoinedAsync(lab, coordinator, unknown.Certificate, "UnknownSite");

        await AssertSettlesAsync(lab, coordinator, agents, "mid");
    }

    [Fact]
    public async Task An_agent_with_another_sites_certificate_is_refused_for_good()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents("mid");
        var mixed = lab.NewFolder("mixed");
        foreach (var path in Directory.GetFiles(lab.SiteBundle("mid")))
            File.Copy(path, Path.Combine(mixed, Path.GetFileName(path)));
        foreach (var name in new[] { "identity.pem", "identity.key" })
            File.Copy(Path.Combine(lab.SiteBundle("high"), name), Path.Combine(mixed, name), overwrite: true);

        var agent = lab.StartAgent("mid", bundle: mixed, state: lab.NewFolder("mixed-state"));

        Assert.Equal(4, await agent.EndAsync(Cancel));
        Assert.Contains("WrongIdentity", agent.Errors, StringComparison.Ordinal);
        await AssertSettlesAsync(lab, coordinator, agents, "mid");
        using var journal = lab.OpenJournal();
        Assert.Contains(journal.Events(), e => e is { Kind: "refused", Site: "high", Reason: "WrongIdentity" });
    }

    [Fact]
    public async Task An_agent_of_another_plan_is_refused_for_good()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        await using var other = await Lab.CreateAsync(Checkout.Load(Checkout.Sample) with { Cycles = 7 });
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents("mid");
        var mixed = lab.NewFolder("mixed");
        foreach (var path in Directory.GetFiles(lab.SiteBundle("mid")))
            File.Copy(path, Path.Combine(mixed, Path.GetFileName(path)));
        File.Copy(Path.Combine(other.SiteBundle("mid"), "site.json"), Path.Combine(mixed, "site.json"), overwrite: true);

        var agent = lab.StartAgent("mid", bundle: mixed, state: lab.NewFolder("mixed-state"));

        Assert.Equal(4, await agent.EndAsync(Cancel));
        Assert.Contains("NotOurPlan", agent.Errors, StringComparison.Ordinal);
        await AssertSettlesAsync(lab, coordinator, agents, "mid");
    }

    [Fact]
    public async Task An_agent_does_not_talk_to_a_coordinator_of_another_authority()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        await using var other = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        await lab.StartCoordinatorAsync();

        var agent = lab.StartAgent("mid", bundle: other.SiteBundle("mid"));

        await agent.WaitForAsync(line => line.Contains("is not this plan's coordinator", StringComparison.Ordinal) && line
            .Contains("UnknownAuthority", StringComparison.Ordinal), Cancel);
    }

    [Fact]
    public async Task Plain_text_and_older_TLS_are_refused()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents("mid");

        using (var plain = new SiteClient(lab.Port, null, "http"))
            await Assert.ThrowsAsync<RpcException>(plain.ReadAsync);

        using var identity = lab.Authority.Issue(new IdentityRequest(IdentityRole.Site, "mid"));
        Assert.Equal(SslProtocols.Tls13, await HandshakeAsync(lab.Port, SslProtocols.Tls13, identity.Certificate));
        await Assert.ThrowsAnyAsync<Exception>(() => HandshakeAsync(lab.Port, SslProtocols.Tls12, identity.Certificate));

        await AssertSettlesAsync(lab, coordinator, agents, "mid");
    }

    [Fact]
    public async Task OpenSsl_gets_TLS_1_3_and_nothing_older()
    {
        OpenSsl.SkipIfAbsent();
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        await lab.StartCoordinatorAsync();
        string[] Arguments(string version) =>
        [
            "s_client", "-connect", $"127.0.0.1:{lab.Port}", version, "-alpn", "h2", "-no_ign_eof",
            "-cert", Path.Combine(lab.SiteBundle("mid"), "identity.pem"), "-key", Path.Combine(lab.SiteBundle("mid"), "identity.key"),
            "-CAfile", Path.Combine(lab.SiteBundle("mid"), "authority.pem"),
        ];

        var (_, newest) = await RunOpenSslAsync(Arguments("-tls1_3"));
        var (code, older) = await RunOpenSslAsync(Arguments("-tls1_2"));

        Assert.Contains("TLSv1.3", newest, StringComparison.Ordinal);
        Assert.Contains("Verify return code: 0 (ok)", newest, StringComparison.Ordinal);
        Assert.NotEqual(0, code);
        Assert.Contains("alert protocol version", older, StringComparison.Ordinal);
    }

    /// <summary>Runs it with an empty standard input, at whose end it hangs up.</summary>
    private static async Task<(int ExitCode, string Output)> RunOpenSslAsync(string[] arguments)
    {
        await using var process = LineProcess.Start("openssl", "openssl", arguments);
        process.CloseInput();
        return (await process.EndAsync(Cancel), process.Output + process.Errors);
    }

    private static async Task<SslProtocols> HandshakeAsync(int port, SslProtocols version, X509Certificate2 certificate)
    {
        using var socket = new TcpClient();
        await socket.ConnectAsync("127.0.0.1", port, Cancel);
#pragma warning disable CA5359 // The server is what is tested.
        await using var tls = new SslStream(socket.GetStream(), false, (_, _, _, _) => true);
#pragma warning restore CA5359
        await tls.AuthenticateAsClientAsync(
            new SslClientAuthenticationOptions { TargetHost = "localhost", EnabledSslProtocols = version, ClientCertificates = [certificate] }, Cancel);
        return tls.SslProtocol;
    }

    /// <summary>The handshake itself must fail, and the coordinator must say why.</summary>
    private static async Task AssertNotConnectedAsync(Lab lab, LineProcess coordinator, X509Certificate2? certificate, string? reason)
    {
        using var client = new SiteClient(lab.Port, certificate);
        var failure = await Assert.ThrowsAsync<RpcException>(client.ReadAsync);
        Assert.Contains(failure.StatusCode, new[] { StatusCode.Unavailable, StatusCode.Internal });
        if (reason is not null)
            await coordinator.WaitForAsync(line => line.Contains("Refused a connection", StringComparison.Ordinal) && line.Contains(reason,
                StringComparison.Ordinal), Cancel);
    }

    /// <summary>The connection holds, but the call is refused with a status, and the coordinator says why.</summary>
    private static async Task AssertNotJoinedAsync(Lab lab, LineProcess coordinator, X509Certificate2 certificate, string reason)
    {
        using var client = new SiteClient(lab.Port, certificate);
        var failure = await Assert.ThrowsAsync<RpcException>(client.ReadAsync);
        Assert.Equal(StatusCode.PermissionDenied, failure.StatusCode);
        await coordinator.WaitForAsync(line => line.Contains("Refused a call", StringComparison.Ordinal) && line.Contains(reason,
            StringComparison.Ordinal), Cancel);
    }

    /// <summary>With the last site's agent everything runs to its end as if nobody had tried anything.</summary>
    private static async Task AssertSettlesAsync(Lab lab, LineProcess coordinator, Dictionary<string, LineProcess> agents, string last)
    {
        agents[last] = lab.StartAgent(last);
        Assert.Equal(0, await coordinator.EndAsync(Cancel));
        foreach (var agent in agents.Values)
            Assert.True(await agent.EndAsync(Cancel) == 0, agent.Errors);
        using var journal = lab.OpenJournal();
        Assert.Equal(lab.Plan.Cycles, journal.Cycles().Count);
        Assert.All(journal.Cycles(), cycle => Assert.Equal("Settled", cycle.End));
        Assert.All(lab.Plan.Network.Sites, site => Assert.Equal(1, journal.Events().Count(e => e.Kind == "joined" && e.Site == site)));
    }
}
