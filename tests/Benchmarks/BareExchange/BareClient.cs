using System.Net.Security;
using System.Security.Authentication;
using System.Security.Cryptography.X509Certificates;
using Grpc.Net.Client;
using Halfvoice.Benchmarks.BareExchange.Wire;

namespace Halfvoice.Benchmarks.BareExchange;

/// <summary>Answers every ask at once, with one integer for each component.</summary>
internal static class BareClient
{
    public static async Task RunAsync(int port, string folder, string name, CancellationToken cancel)
    {
        using var certificate = Identities.Load(folder, name);
        var validator = Identities.Validator(folder);
        using var handler = new SocketsHttpHandler
        {
            UseProxy = false,
            EnableMultipleHttp2Connections = false,
            SslOptions = new SslClientAuthenticationOptions
            {
                EnabledSslProtocols = SslProtocols.Tls13,
                LocalCertificateSelectionCallback = (_, _, _, _, _) => certificate,
                RemoteCertificateValidationCallback = (_, shown, _, _) => validator.CheckServer(shown as X509Certificate2).IsAccepted,
            },
        };
        using var channel = GrpcChannel.ForAddress($"https://localhost:{port}", new GrpcChannelOptions { HttpHandler = handler });
        using var call = new Bare.BareClient(channel).Exchange(cancellationToken: cancel);
        await call.ResponseHeadersAsync;
        Console.WriteLine("""{"ready":true}""");

        var answer = new BareAnswer { Version = 1 };
        while (await call.ResponseStream.MoveNext(cancel))
        {
            var ask = call.ResponseStream.Current;
            answer.Cycle = ask.Cycle;
            answer.Round = ask.Round;
            answer.Sequence++;
            answer.Steps.Clear();
            for (var i = 0; i < ask.Target.Count; i++)
                answer.Steps.Add((long)(ask.Target[i] - ask.Price[i]));
            await call.RequestStream.WriteAsync(answer, cancel);
        }
    }
}
