using System.Security.Cryptography.X509Certificates;
using Grpc.Core;
using Halfvoice.Hosting;

namespace Halfvoice.Coordinator;

/// <summary>Who a caller is, by the certificate of the connection; nothing that the caller says counts.</summary>
internal sealed class CallerIdentity
{
    private readonly PeerValidator _validator;
    private readonly Serilog.ILogger _log;

    public CallerIdentity(PeerValidator validator, Serilog.ILogger log)
    {
        _validator = validator;
        _log = log;
    }

    /// <summary>The check at the handshake: any role of this rehearsal may connect, what it may call is checked at the call.</summary>
    public bool MayConnect(X509Certificate2 certificate)
    {
        var verdict = _validator.CheckClient(certificate, PeerRole.Site, PeerRole.Operator, PeerRole.Rig);
        if (!verdict.IsAccepted)
            _log.Warning("Refused a connection: {Reason}. {Explanation}", verdict.Refusal, verdict.Explanation);
        return verdict.IsAccepted;
    }

    /// <summary>The site that calls.</summary>
    /// <exception cref="RpcException">The caller is not a site, or its certificate no longer holds.</exception>
    public string SiteOf(ServerCallContext context)
    {
        var verdict = _validator.CheckClient(context.GetHttpContext().Connection.ClientCertificate, PeerRole.Site);
        if (verdict.Identity?.Site is { } site)
            return site;
        _log.Warning("Refused a call: {Reason}. {Explanation}", verdict.Refusal, verdict.Explanation);
        throw new RpcException(new Status(StatusCode.PermissionDenied, $"Only a site may join ({verdict.Refusal})."));
    }

    /// <summary>What a caller hears whose certificate holds and names a site that the plan does not have.</summary>
    public RpcException NotOfThePlan(string site)
    {
        _log.Warning("Refused a call: {Reason}. The plan has no site {Site}", "UnknownSite", site);
        return new RpcException(new Status(StatusCode.PermissionDenied, "The plan has no site of the certificate's name."));
    }
}
