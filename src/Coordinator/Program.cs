using System.Net.Sockets;
using System.Runtime.InteropServices;
using System.Security.Authentication;
using System.Security.Cryptography;
using System.Security.Cryptography.X509Certificates;
using System.Text.Json;
using Halfvoice.Coordination;
using Halfvoice.Coordinator;
using Halfvoice.Hosting;
using Halfvoice.Wire;
using Microsoft.AspNetCore.Hosting.Server;
using Microsoft.AspNetCore.Hosting.Server.Features;
using Microsoft.AspNetCore.Server.Kestrel.Core;
using Microsoft.AspNetCore.Server.Kestrel.Https;
using Microsoft.Data.Sqlite;
using Serilog;
using Serilog.Formatting.Compact;

return await CoordinatorOptions.RunAsync(args, CoordinatorProgram.RunAsync).ConfigureAwait(false);

/// <summary>Reads the bundle, opens the journal, listens, runs the cycles and ends in good order.</summary>
internal static class CoordinatorProgram
{
    public static async Task<int> RunAsync(CoordinatorOptions options)
    {
        try
        {
            Directory.CreateDirectory(options.State);
        }
        catch (Exception unusable) when (unusable is IOException or UnauthorizedAccessException)
        {
            await Console.Error.WriteLineAsync($"Cannot start: the state folder cannot be used: {unusable.Message}").ConfigureAwait(false);
            return ExitCodes.WrongSetup;
        }

        await using var log = OpenLog(options.State);
        try
        {
            return await ServeAsync(options, log).ConfigureAwait(false);
        }
        catch (Exception wrong) when (wrong is FileNotFoundException or DirectoryNotFoundException or UnauthorizedAccessException
            or JsonException or CryptographicException or InvalidDataException)
        {
            log.Fatal("Cannot start: {Problem}", wrong.Message);
            return ExitCodes.WrongSetup;
        }
        catch (Exception broken) when (broken is IOException or SocketException or SqliteException or InvalidOperationException or ArgumentException)
        {
            log.Fatal("Broken off: {Problem}", broken.Message);
            return ExitCodes.Broken;
        }
    }

    private static Serilog.Core.Logger OpenLog(string state)
    {
        return new LoggerConfiguration()
            .MinimumLevel.Information()
            .WriteTo.File(new CompactJsonFormatter(), Path.Combine(state, "coordinator.jsonl"),
                fileSizeLimitBytes: 64L << 20, rollOnFileSizeLimit: true, retainedFileCountLimit: 4)
            .WriteTo.Console(restrictedToMinimumLevel: Serilog.Events.LogEventLevel.Warning, standardErrorFromLevel: Serilog.Events.LogEventLevel.Verbose,
                formatProvider: System.Globalization.CultureInfo.InvariantCulture)
            .CreateLogger();
    }

    private static async Task<int> ServeAsync(CoordinatorOptions options, Serilog.Core.Logger log)
    {
        var setup = BundleFile.Read(options.Bundle, "coordinator.json", path => SetupJson.ReadCoordinator(File.ReadAllText(path)));
        using var journal = Journal.Open(Path.Combine(options.State, "journal.sqlite"), setup, TimeProvider.System);
        var core = new CoordinatorCore(setup);
        if (journal.ReadEnd() is { } end)
        {
            core.Resume(end.Last, end.CycleClosed, end.State);
            log.Information("Resuming after {Round} from the journal", end.Last);
        }

        using var progress = new ProgressLines(Console.OpenStandardOutput(), setup);
        using var host = new DispatchHost(setup, core, journal, progress, TimeProvider.System, log);
        using var authority = BundleFile.Read(options.Bundle, "authority.pem", X509CertificateLoader.LoadCertificateFromFile);
        using var identity = BundleFile.Read(options.Bundle, "identity.pem",
            path => X509Certificate2.CreateFromPemFile(path, Path.ChangeExtension(path, "key")));
        var revoked = new RevocationListFile(Path.Combine(options.Bundle, "revoked.crl"), authority);
        var caller = new CallerIdentity(new PeerValidator(authority, () => revoked.Current, TimeProvider.System), log);
        await using var app = BuildServer(options, host, caller, identity, log);
        await app.StartAsync().ConfigureAwait(false);

        Lifeline.Watch(host.Stop);
        using var terminate = PosixSignalRegistration.Create(PosixSignal.SIGTERM, AskToStop);
        using var interrupt = PosixSignalRegistration.Create(PosixSignal.SIGINT, AskToStop);
        var address = new Uri(app.Services.GetRequiredService<IServer>().Features.Get<IServerAddressesFeature>()!.Addresses.First());
        progress.Ready(address.Host, address.Port);
        log.Information("Plan {Plan}: listening on {Host}:{Port} for {Sites} sites", setup.Plan, address.Host, address.Port, setup.Sites.Count);

        host.Start();
        await host.Done.ConfigureAwait(false);
        progress.Finished();
        using var grace = new CancellationTokenSource(TimeSpan.FromSeconds(5));
        await app.StopAsync(grace.Token).ConfigureAwait(false);
        log.Information("Finished");
        return ExitCodes.Done;

        void AskToStop(PosixSignalContext context)
        {
            context.Cancel = true;
            host.Stop();
        }
    }

    private static WebApplication BuildServer(
        CoordinatorOptions options, DispatchHost host, CallerIdentity caller, X509Certificate2 identity, Serilog.ILogger log)
    {
        var builder = WebApplication.CreateEmptyBuilder(new WebApplicationOptions());
        builder.Logging.AddSerilog(log).AddFilter("Microsoft", LogLevel.Warning).AddFilter("Grpc", LogLevel.Warning);
        builder.WebHost.UseKestrelCore().UseKestrelHttpsConfiguration().ConfigureKestrel(kestrel =>
        {
            kestrel.AddServerHeader = false;
            kestrel.Limits.MaxConcurrentConnections = 4 * (host.SiteCount + 16);
            kestrel.Limits.Http2.MaxStreamsPerConnection = 4;
            kestrel.Limits.Http2.KeepAlivePingDelay = TimeSpan.FromSeconds(WireContract.PulseSeconds);
            kestrel.Limits.Http2.KeepAlivePingTimeout = TimeSpan.FromSeconds(WireContract.DeadAfterSeconds);
            kestrel.Limits.MinRequestBodyDataRate = null;
            kestrel.Limits.MinResponseDataRate = null;
            kestrel.Listen(options.Listen, endpoint =>
            {
                endpoint.Protocols = HttpProtocols.Http2;
                endpoint.UseHttps(https =>
                {
                    https.ServerCertificate = identity;
                    https.SslProtocols = SslProtocols.Tls13;
                    https.ClientCertificateMode = ClientCertificateMode.RequireCertificate;
                    https.CheckCertificateRevocation = false; // The lab's own list is checked in the callback.
                    https.ClientCertificateValidation = (certificate, _, _) => caller.MayConnect(certificate);
                });
            });
        });
        builder.Services.AddRoutingCore();
        builder.Services.AddGrpc(grpc =>
        {
            grpc.MaxReceiveMessageSize = WireContract.MaxMessageBytes;
            grpc.MaxSendMessageSize = WireContract.MaxMessageBytes;
            grpc.EnableDetailedErrors = false;
        });
        builder.Services.AddSingleton(host);
        builder.Services.AddSingleton(caller);
        builder.Services.AddSingleton<DispatchService>();
        var app = builder.Build();
        app.UseRouting();
        app.MapGrpcService<DispatchService>();
        return app;
    }
}
