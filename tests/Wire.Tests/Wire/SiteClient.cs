using System.Net.Security;
using System.Security.Authentication;
using System.Security.Cryptography.X509Certificates;
using Google.Protobuf;
using Grpc.Core;
using Grpc.Net.Client;
using Halfvoice.Tests.Rehearsals;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Tests.Wire;

/// <summary>
/// A client that puts any bytes into a gRPC stream, with any certificate. It is not the agent: it does what an agent never
/// would.
/// </summary>
internal sealed class SiteClient : IDisposable
{
    private static readonly Method<byte[], V1.FromCoordinator> _join = new(
        MethodType.DuplexStreaming, "halfvoice.v1.Dispatch", "Join",
        Marshallers.Create<byte[]>(bytes => bytes, bytes => bytes),
        Marshallers.Create(message => message.ToByteArray(), V1.FromCoordinator.Parser.ParseFrom));

    private readonly GrpcChannel _channel;
    private readonly AsyncDuplexStreamingCall<byte[], V1.FromCoordinator> _call;
    private ulong _sequence;

    public SiteClient(int port, X509Certificate2? certificate, string scheme = "https")
    {
        var handler = new SocketsHttpHandler
        {
            SslOptions = new SslClientAuthenticationOptions
            {
                ClientCertificates = certificate is null ? [] : [certificate],
                EnabledSslProtocols = SslProtocols.Tls13,
#pragma warning disable CA5359 // What is tested here is the server's check of us, not ours of the server.
                RemoteCertificateValidationCallback = (_, _, _, _) => true,
#pragma warning restore CA5359
            },
        };
        _channel = GrpcChannel.ForAddress($"{scheme}://127.0.0.1:{port}", new GrpcChannelOptions
        {
            HttpHandler = handler,
            DisposeHttpClient = true,
            MaxSendMessageSize = null,
        });
        _call = _channel.CreateCallInvoker().AsyncDuplexStreamingCall(_join, null, new CallOptions(cancellationToken: Cancel));
    }

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    /// <summary>A header with the next sequence number.</summary>
    public V1.Header Header(int cycle = 0, int round = 0) =>
        new() { Protocol = 1, Cycle = (uint)cycle, Round = (uint)round, Sequence = ++_sequence };

    public Task SendAsync(IMessage message) => SendAsync(message.ToByteArray());

    public Task SendAsync(byte[] bytes) => _call.RequestStream.WriteAsync(bytes, Cancel).WaitAsync(LineProcess.Patience, Cancel);

    /// <summary>The next message, or null where the other end closed in good order.</summary>
    /// <exception cref="RpcException">The other end closed with a status.</exception>
    public async Task<V1.FromCoordinator?> ReadAsync() =>
        await _call.ResponseStream.MoveNext(Cancel).WaitAsync(LineProcess.Patience, Cancel) ? _call.ResponseStream.Current : null;

    /// <summary>Reads on, past pulses and asks, to the next message of a kind.</summary>
    public async Task<V1.FromCoordinator> ReadAsync(V1.FromCoordinator.BodyOneofCase kind)
    {
        while (await ReadAsync() is { } message)
        {
            if (message.BodyCase == kind)
                return message;
        }

        throw new InvalidOperationException($"The stream ended before a {kind} came.");
    }

    /// <summary>Reads to the end of the stream and hangs up at a refusal; the refusal that came, if one did.</summary>
    public async Task<V1.Refusal?> EndAsync()
    {
        V1.Refusal? refusal = null;
        while (await ReadAsync() is { } message)
        {
            if (message.Refusal is null)
                continue;
            refusal = message.Refusal;
            await CompleteAsync();
        }

        return refusal;
    }

    /// <summary>Says that nothing more will come.</summary>
    public Task CompleteAsync() => _call.RequestStream.CompleteAsync().WaitAsync(LineProcess.Patience, Cancel);

    public void Dispose()
    {
        _call.Dispose();
        _channel.Dispose();
    }
}
