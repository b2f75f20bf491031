using System.Net;
using System.Net.Security;
using System.Runtime.InteropServices;
using System.Security.Authentication;
using System.Security.Cryptography;
using System.Security.Cryptography.X509Certificates;
using System.Text.Json;
using Grpc.Net.Client;
using Halfvoice.Agent;
using Halfvoice.Coordination;
using Halfvoice.Hosting;
using Halfvoice.Plans;
using Halfvoice.Wire;
using Microsoft.Data.Sqlite;
using Serilog;
using Serilog.Formatting.Compact;
using V1 = Halfvoice.Wire.V1;

return await AgentOptions.RunAsync(args, AgentProgram.RunAsync).ConfigureAwait(false);

/// <summary>Reads the bundle, opens the ledger, dials the coordinator and ends in good order.</summary>
internal static class AgentProgram
{
    public static async Task<int> RunAsync(AgentOptions options)
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
            return await AnswerAsync(options, log).ConfigureAwait(false);
        }
        catch (Exception wrong) when (wrong is FileNotFoundException or DirectoryNotFoundException or UnauthorizedAccessException
            or JsonException or CryptographicException or InvalidDataException or ArgumentException)
        {
            log.Fatal("Cannot start: {Problem}", wrong.Message);
            return ExitCodes.WrongSetup;
        }
        catch (Exception broken) when (broken is IOException or SqliteException or InvalidOperationException or SiteBrokenException)
        {
            log.Fatal("Broken off: {Problem}", broken.Message);
            return ExitCodes.Broken;
        }
    }

    private static Serilog.Core.Logger OpenLog(string state)
    {
        return new LoggerConfiguration()
            .MinimumLevel.Information()
            .WriteTo.File(new CompactJsonFormatter(), Path.Combine(state, "agent.jsonl"),
                fileSizeLimitBytes: 16L << 20, rollOnFileSizeLimit: true, retainedFileCountLimit: 4)
            .WriteTo.Console(restrictedToMinimumLevel: Serilog.Events.LogEventLevel.Warning, standardErrorFromLevel: Serilog.Events.LogEventLevel.Verbose,
                formatProvider: System.Globalization.CultureInfo.InvariantCulture)
            .CreateLogger();
    }

    private static async Task<int> AnswerAsync(AgentOptions options, Serilog.Core.Logger log)
    {
        var setup = BundleFile.Read(options.Bundle, "site.json", path => SetupJson.ReadSite(File.ReadAllText(path)));
        log.Information("Shadow mode: set-points are computed and logged, and written to no equipment");
        if (setup.Privacy.Mechanism == MechanismKind.None)
            log.Warning("Mechanism none: this site's answers are NOT veiled, and its loads can be recovered from them");
        var loads = BundleFile.Read(options.Bundle, "loads.csv", path => ReadLoads(path, setup));
        using var ledger = SiteLedger.Open(Path.Combine(options.State, "ledger.sqlite"), setup, TimeProvider.System);
        var core = new SiteCore(setup, new SeriesReadings(loads), new OperatingSystemNoise(), ledger.ReadCharges(), out var forfeited);
        ledger.Store(forfeited, []);
        if (forfeited.Count > 0)
            log.Warning("Forfeited {Reservations} reservations that were open when the last agent ended", forfeited.Count);

        using var authority = BundleFile.Read(options.Bundle, "authority.pem", X509CertificateLoader.LoadCertificateFromFile);
        using var identity = BundleFile.Read(options.Bundle, "identity.pem",
            path => X509Certificate2.CreateFromPemFile(path, Path.ChangeExtension(path, "key")));
        var revoked = new RevocationListFile(Path.Combine(options.Bundle, "revoked.crl"), authority);
        var validator = new PeerValidator(authority, () => revoked.Current, TimeProvider.System);
        using var stop = new CancellationTokenSource();
        Lifeline.Watch(stop.Cancel);
        using var terminate = PosixSignalRegistration.Create(PosixSignal.SIGTERM, AskToStop);
        using var interrupt = PosixSignalRegistration.Create(PosixSignal.SIGINT, AskToStop);
        using var channel = Dial(AddressOf(options, setup), identity, validator, log);
        var host = new AgentHost(setup, core, ledger, TimeProvider.System, log);
        return await host.RunAsync(new V1.Dispatch.DispatchClient(channel), stop.Token).ConfigureAwait(false);

        void AskToStop(PosixSignalContext context)
        {
            context.Cancel = true;
            stop.Cancel();
        }
    }

    private static LoadSeries ReadLoads(string path, SiteSetup setup)
    {
        var (series, errors) = SiteLoadFile.Read(File.ReadAllBytes(path), setup.Buses.Select(bus => bus.Name).ToArray());
        return series ?? throw new InvalidDataException(string.Join(Environment.NewLine, errors.Select(error => error.Text)));
    }

    private static DnsEndPoint AddressOf(AgentOptions options, SiteSetup setup) => options.Coordinator
        ?? AgentOptions.ReadEndPoint(setup.Coordinator ?? string.Empty)
        ?? throw new InvalidDataException("Neither the bundle nor --coordinator says where the coordinator is. Give --coordinator HOST:PORT.");

    private static GrpcChannel Dial(DnsEndPoint coordinator, X509Certificate2 identity, PeerValidator validator, Serilog.ILogger log)
    {
        var handler = new SocketsHttpHandler
        {
            ConnectTimeout = TimeSpan.FromSeconds(15),
            KeepAlivePingDelay = TimeSpan.FromSeconds(WireContract.PulseSeconds),
            KeepAlivePingTimeout = TimeSpan.FromSeconds(WireContract.DeadAfterSeconds),
            PooledConnectionIdleTimeout = Timeout.InfiniteTimeSpan,
            SslOptions = new SslClientAuthenticationOptions
            {
                ClientCertificates = [identity],
                EnabledSslProtocols = SslProtocols.Tls13,
                CertificateRevocationCheckMode = X509RevocationMode.NoCheck, // The lab's own list is checked in the callback.
                RemoteCertificateValidationCallback = (_, certificate, _, _) => IsCoordinator(certificate as X509Certificate2, validator, log),
            },
        };
        return GrpcChannel.ForAddress(new UriBuilder("https", coordinator.Host, coordinator.Port).Uri, new GrpcChannelOptions
        {
            HttpHandler = handler,
            DisposeHttpClient = true,
            MaxReceiveMessageSize = WireContract.MaxMessageBytes,
            MaxSendMessageSize = WireContract.MaxMessageBytes,
            MaxRetryAttempts = null,
        });
    }

    private static bool IsCoordinator(X509Certificate2? certificate, PeerValidator validator, Serilog.ILogger log)
    {
        var verdict = validator.CheckServer(certificate);
        if (!verdict.IsAccepted)
            log.Error("The other end is not this plan's coordinator: {Reason}. {Explanation}", verdict.Refusal, verdict.Explanation);
        return verdict.IsAccepted;
    }
}
