using System.Diagnostics;
using System.Globalization;
using System.Net;
using System.Security.Authentication;
using Halfvoice.Hosting;
using Microsoft.AspNetCore.Hosting.Server;
using Microsoft.AspNetCore.Hosting.Server.Features;
using Microsoft.AspNetCore.Server.Kestrel.Core;
using Microsoft.AspNetCore.Server.Kestrel.Https;

namespace Halfvoice.Benchmarks.BareExchange;

/// <summary>Waits for its clients, asks them all round after round, and says how fast that went.</summary>
internal static class BareServer
{
    public static async Task RunAsync(int clients, int rounds, int warmUp, int components, string folder, CancellationToken cancel)
    {
        var fan = new Fan(clients, components);
        var app = Build(fan, folder);
        await app.StartAsync(cancel);
        var address = app.Services.GetRequiredService<IServer>().Features.Get<IServerAddressesFeature>()!.Addresses.Single();
        Console.WriteLine($$"""{"ready":true,"port":{{new Uri(address).Port}}}""");

        await fan.Complete.WaitAsync(cancel);
        Console.WriteLine($$"""{"connected":{{clients}}}""");

        for (var round = 0; round < warmUp; round++)
            await fan.RoundAsync(cancel);
        var milliseconds = new double[rounds];
        var clock = Stopwatch.StartNew();
        for (var round = 0; round < rounds; round++)
        {
            var begin = clock.Elapsed;
            await fan.RoundAsync(cancel);
            milliseconds[round] = (clock.Elapsed - begin).TotalMilliseconds;
        }

        var seconds = clock.Elapsed.TotalSeconds;
        Array.Sort(milliseconds);
        double At(int percent) => milliseconds[rounds * percent / 100];
        Console.WriteLine(string.Create(
            CultureInfo.InvariantCulture,
            $$"""{"rounds":{{rounds}},"seconds":{{seconds}},"median_ms":{{At(50)}},"p99_ms":{{At(99)}}}"""));

        // The clients stay connected until we are told to stop, so that their memory can be measured as it is after the work.
        await new TaskCompletionSource().Task.WaitAsync(cancel);
    }

    private static WebApplication Build(Fan fan, string folder)
    {
        var certificate = Identities.Load(folder, "coordinator");
        var validator = Identities.Validator(folder);
        var builder = WebApplication.CreateEmptyBuilder(new WebApplicationOptions());
        builder.WebHost.UseKestrelCore().UseKestrelHttpsConfiguration();
        builder.WebHost.ConfigureKestrel(kestrel => kestrel.Listen(IPAddress.Loopback, 0, listen =>
        {
            listen.Protocols = HttpProtocols.Http2;
            listen.UseHttps(new HttpsConnectionAdapterOptions
            {
                ServerCertificate = certificate,
                SslProtocols = SslProtocols.Tls13,
                ClientCertificateMode = ClientCertificateMode.RequireCertificate,
                ClientCertificateValidation = (shown, _, _) => validator.CheckClient(shown, PeerRole.Site).IsAccepted,
            });
        }));
        builder.Services.AddRoutingCore();
        builder.Services.AddGrpc();
        builder.Services.AddSingleton(fan);
        var app = builder.Build();
        app.UseRouting();
        app.MapGrpcService<BareService>();
        return app;
    }
}
