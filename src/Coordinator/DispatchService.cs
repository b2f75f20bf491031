using System.Threading.Channels;
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
        var stream = new SiteStream(index, site);
        var write = WriteAllAsync(stream, responseStream, context.CancellationToken);
        var read = ReadAllAsync(stream, requestStream, context.CancellationToken);
        try
        {
            // Whichever ends first ends the stream: the site hung up, or we have nothing more to say to it. In the second case the
            // site gets a moment to read to the end and hang up, because returning at once would cut off what is under way.
            var first = await Task.WhenAny(write, read).ConfigureAwait(false);
            if (first == write)
            {
                await read.WaitAsync(HangUpGrace, context.CancellationToken).ConfigureAwait(false);
            }
            else
            {
                // After a faulty message the host still has its refusal to send and completes the stream itself.
                if (!await read.ConfigureAwait(false))
                    stream.Complete();
                await write.WaitAsync(HangUpGrace, context.CancellationToken).ConfigureAwait(false);
            }

            await first.ConfigureAwait(false);
        }
        catch (Exception failure) when (failure is OperationCanceledException or IOException or InvalidOperationException or TimeoutException)
        {
            // The connection is gone; that the site left is all there is to say, and it is said below.
        }
        finally
        {
            await _host.Events.Writer.WriteAsync(new HostEvent.Leaving(stream)).AsTask()
                .ContinueWith(_ => { }, TaskScheduler.Default).ConfigureAwait(false);
        }
    }

    private static async Task WriteAllAsync(SiteStream stream, IServerStreamWriter<V1.FromCoordinator> writer, CancellationToken cancel)
    {
        await foreach (var message in stream.Outgoing.ReadAllAsync(cancel).ConfigureAwait(false))
            await writer.WriteAsync(message, cancel).ConfigureAwait(false);
    }

    /// <returns>True when it ended at a faulty message that the host has yet to answer, false when the site said that it was done.</returns>
    private async Task<bool> ReadAllAsync(SiteStream stream, IAsyncStreamReader<V1.FromSite> reader, CancellationToken cancel)
    {
        var enrolled = false;
        while (true)
        {
            HostEvent? next;
            try
            {
                if (!await reader.MoveNext(cancel).ConfigureAwait(false))
                    return false;
                next = Take(stream, reader.Current, ref enrolled);
                if (next is null)
                    continue;
            }
            catch (Exception unreadable) when (IsUnreadable(unreadable))
            {
                next = Fault(stream, RefusalReason.Malformed, $"The message is no {nameof(V1.FromSite)}, or is larger than {WireContract.MaxMessageBytes} bytes.");
            }

            if (next is HostEvent.Leaving)
                return false;
            var heard = await OfferAsync(next, cancel).ConfigureAwait(false);
            if (next is HostEvent.Faulty)
                return heard;
        }
    }

    /// <summary>
    /// Hands an event to the host; false once the run is over. What is under way then no longer matters, and it must not end the
    /// stream before the farewell has left: the site hangs up when it has read it.
    /// </summary>
    private async Task<bool> OfferAsync(HostEvent next, CancellationToken cancel)
    {
        try
        {
            await _host.Events.Writer.WriteAsync(next, cancel).ConfigureAwait(false);
            return true;
        }
        catch (ChannelClosedException)
        {
            return false;
        }
    }

    /// <summary>What gRPC throws at a message that is too large, compressed in an unknown way, or no message of this contract.</summary>
    private static bool IsUnreadable(Exception failure) => failure is InvalidProtocolBufferException
        || failure is RpcException { StatusCode: StatusCode.ResourceExhausted or StatusCode.Internal or StatusCode.Unimplemented };

    /// <summary>What the host must hear of a message; null for nothing.</summary>
    private static HostEvent? Take(SiteStream stream, V1.FromSite received, ref bool enrolled)
    {
        stream.CountUp(received);
        var (message, fault) = stream.Wire.Read(received);
        if (message is FromSiteMessage.Farewell)
            return new HostEvent.Leaving(stream);
        return fault is not null ? new HostEvent.Faulty(stream, fault.At(RoundId.None)) : Translate(stream, message!, ref enrolled);
    }

    private static HostEvent? Translate(SiteStream stream, FromSiteMessage message, ref bool enrolled)
    {
        switch (message)
        {
            case FromSiteMessage.Enrolled enrol when !enrolled:
                enrolled = true;
                return enrol.Site == stream.Name
                    ? new HostEvent.Joining(stream, enrol.Enrol)
                    : Fault(stream, RefusalReason.WrongIdentity, "The enrolment names another site than the certificate.");
            case FromSiteMessage.Enrolled:
                return Fault(stream, RefusalReason.OutOfOrder, "A site enrols once a stream.");
            case FromSiteMessage.Pulse:
                return null;
            case FromSiteMessage.Answered answered when enrolled:
                return new HostEvent.Answered(stream, answered.Answer);
            case FromSiteMessage.Refused refused when enrolled:
                return new HostEvent.Refused(stream, refused.Refusal);
            default:
                return Fault(stream, RefusalReason.OutOfOrder, "A site enrols before it says anything else.");
        }
    }

    private static HostEvent.Faulty Fault(SiteStream stream, RefusalReason reason, string text) =>
        new(stream, new Refusal(RoundId.None, reason, text));
}
