using Google.Protobuf;
using Grpc.Core;
using Halfvoice.Coordination;
using Halfvoice.Wire;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Coordinator;

/// <summary>The gRPC face: proves who calls, checks what comes in, and hands it to the host's queue.</summary>
internal sealed class DispatchService : V1.Dispatch.DispatchBase
{
    private static readonly TimeSpan HangUpGrace = TimeSpan.FromSeconds(5);

    private readonly DispatchHost _host;
    private readonly CallerIdentity _identity;

    public DispatchService(DispatchHost host, CallerIdentity identity)
    {
        _host = host;
        _identity = identity;
    }

    public override async Task Join(
        IAsyncStreamReader<V1.FromSite> requestStream, IServerStreamWriter<V1.FromCoordinator> responseStream, ServerCallContext context)
    {
        var site = _identity.SiteOf(context);
        var index = _host.IndexOf(site) ?? throw _identity.NotOfThePlan(site);
        var stream = new SiteStream(index, site, responseStream, context.GetHttpContext().Abort);
        var read = ReadAllAsync(stream, requestStream, context.CancellationToken);
        try
        {
            // Whichever ends first ends the stream: the site hung up, or we have nothing more to say to it. In the second case the
            // site gets a moment to read to the end and hang up, because returning at once would cut off what is under way.
            if (await Task.WhenAny(stream.AllSent, read).ConfigureAwait(false) == read)
                stream.Complete();
            await stream.AllSent.WaitAsync(HangUpGrace, context.CancellationToken).ConfigureAwait(false);
            await read.WaitAsync(HangUpGrace, context.CancellationToken).ConfigureAwait(false);
        }
        catch (Exception failure) when (failure is OperationCanceledException or IOException or InvalidOperationException or TimeoutException)
        {
            // The connection is gone; that the site left is all there is to say, and it is said below.
        }
        finally
        {
            _host.Leave(stream);
        }
    }

    /// <summary>Reads until the site hangs up, says farewell, or sends something that ends its stream.</summary>
    private async Task ReadAllAsync(SiteStream stream, IAsyncStreamReader<V1.FromSite> reader, CancellationToken cancel)
    {
        var enrolled = false;
        try
        {
            while (await reader.MoveNext(cancel).ConfigureAwait(false))
            {
                stream.CountUp(reader.Current);
                var (message, fault) = stream.Wire.Read(reader.Current);
                if (fault is not null)
                    _host.Fault(stream, fault.At(RoundId.None));
                if (fault is not null || message is FromSiteMessage.Farewell || !Hand(stream, message!, ref enrolled))
                    return;
            }
        }
        catch (Exception unreadable) when (IsUnreadable(unreadable))
        {
            Fault(stream, RefusalReason.Malformed, $"The message is no {nameof(V1.FromSite)}, or is larger than {WireContract.MaxMessageBytes} bytes.");
        }
    }

    /// <summary>What gRPC throws at a message that is too large, compressed in an unknown way, or no message of this contract.</summary>
    private static bool IsUnreadable(Exception failure) => failure is InvalidProtocolBufferException
        || failure is RpcException { StatusCode: StatusCode.ResourceExhausted or StatusCode.Internal or StatusCode.Unimplemented };

    /// <summary>Hands a checked message to the host; false where it came out of turn and the stream ends.</summary>
    private bool Hand(SiteStream stream, FromSiteMessage message, ref bool enrolled)
    {
        switch (message)
        {
            case FromSiteMessage.Enrolled enrol when !enrolled && enrol.Site == stream.Name:
                enrolled = true;
                _host.Join(stream, enrol.Enrol);
                return true;
            case FromSiteMessage.Enrolled when !enrolled:
                return Fault(stream, RefusalReason.WrongIdentity, "The enrolment names another site than the certificate.");
            case FromSiteMessage.Enrolled:
                return Fault(stream, RefusalReason.OutOfOrder, "A site enrols once a stream.");
            case FromSiteMessage.Pulse:
                return true;
            case FromSiteMessage.Answered answered when enrolled:
                _host.Answer(stream, answered.Answer);
                return true;
            case FromSiteMessage.Refused refused when enrolled:
                _host.Refuse(stream, refused.Refusal);
                return true;
            default:
                return Fault(stream, RefusalReason.OutOfOrder, "A site enrols before it says anything else.");
        }
    }

    private bool Fault(SiteStream stream, RefusalReason reason, string text)
    {
        _host.Fault(stream, new Refusal(RoundId.None, reason, text));
        return false;
    }
}
