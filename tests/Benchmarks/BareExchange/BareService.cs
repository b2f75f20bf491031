using Grpc.Core;
using Halfvoice.Benchmarks.BareExchange.Wire;

namespace Halfvoice.Benchmarks.BareExchange;

/// <summary>Hands each stream to the fan and keeps it open.</summary>
internal sealed class BareService(Fan fan) : Bare.BareBase
{
    public override async Task Exchange(
        IAsyncStreamReader<BareAnswer> requestStream, IServerStreamWriter<BareAsk> responseStream, ServerCallContext context)
    {
        await context.WriteResponseHeadersAsync([]);
        await fan.JoinAsync(requestStream, responseStream, context.CancellationToken);
    }
}
