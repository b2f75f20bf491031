using System.Diagnostics;
using System.Globalization;
using System.Text.Json;
using Halfvoice.Rig.Authority;
using Halfvoice.Rig.Binaries;
using Halfvoice.Rig.Processes;

namespace Halfvoice.Benchmarks;

/// <summary>
/// The exchange's yardstick: a gRPC program with the product's payload, processes and mutual TLS, and nothing behind them, asks
/// N client processes round after round. The product's own exchange is held against it (design §11: 0.8 or more).
/// </summary>
public static class ExchangeBenchmark
{
    /// <summary>Least share of the bare exchange's speed that the product's must reach.</summary>
    public const double LeastRatio = 0.8;

    private static readonly TimeSpan _patience = TimeSpan.FromMinutes(5);

    /// <summary>
    /// Measures the bare exchange, the real one, and the bare one again, and prints all. Arguments:
    /// <c>--clients 12,118</c>, <c>--rounds 1000</c>, <c>--components 1</c>,
    /// <c>--jit</c>.
    /// </summary>
    /// <returns>0, 1 where the real exchange missed its ratio to the better bare one, or 64 for arguments that make no sense.</returns>
    public static int Run(string[] args)
    {
        ArgumentNullException.ThrowIfNull(args);
        if (!TryRead(args, out var clients, out var rounds, out var components, out var jit))
        {
            Console.Error.WriteLine("exchange [--clients 12,118] [--rounds 1000] [--components 1] [--jit]");
            return 64;
        }

        var reached = true;
        foreach (var count in clients)
        {
            var bare = MeasureBareAsync(count, rounds, components, jit).GetAwaiter().GetResult();
            var real = RealExchange.MeasureAsync(count, rounds, jit).GetAwaiter().GetResult();
            var again = MeasureBareAsync(count, rounds, components, jit).GetAwaiter().GetResult();
            Console.WriteLine(bare);
            Console.WriteLine(again);
            Console.WriteLine(FormattableString.Invariant(
                $"real, {count} agents: {real.Rounds} rounds, joined in {real.ReadySeconds:0.00} s, largest agent {real.ResidentMb:0.0} MB"));
            reached &= Compare(bare.RoundsPerSecond > again.RoundsPerSecond ? bare : again, real.RoundsPerSecond);
        }

        return reached ? 0 : 1;
    }

    /// <summary>Starts the bare program once as server and <paramref name="clients"/> times as client, and measures.</summary>
    /// <param name="clients">1 to 1,000 processes.</param>
    /// <param name="rounds">Rounds to measure; a tenth as many come before as warm-up.</param>
    /// <param name="components">Numbers in an answer: buses of a site.</param>
    /// <param name="jit">Uses the JIT build also where an ahead-of-time build could be made; the product must be built likewise.</param>
    /// <param name="cancel">Ends the measurement.</param>
    public static async Task<BareExchangeResult> MeasureBareAsync(
        int clients, int rounds, int components = 1, bool jit = false, CancellationToken cancel = default)
    {
        var executable = await PublishAsync(jit, cancel).ConfigureAwait(false);
        var folder = Directory.CreateTempSubdirectory("halfvoice-bare-").FullName;
        try
        {
            WriteIdentities(folder, clients);
            await using var fleet = new ProcessFleet(cancel: cancel);
            var (server, ready) = await fleet.StartReadyAsync(
                Start("server", executable, ["server", $"{clients}", $"{rounds}", $"{WarmUp(rounds)}", $"{components}", folder]),
                IsReady, _patience, cancel).ConfigureAwait(false);
            var port = Number(ready, "port");

            var clock = Stopwatch.StartNew();
            var starts = Enumerable.Range(0, clients)
                .Select(number => Start($"client {number}", executable, ["client", $"{port}", folder, $"site-{number}"])).ToList();
            var children = await fleet.StartAllAsync(starts, IsReady, _patience, cancel: cancel).ConfigureAwait(false);
            await server.WaitForLineAsync(Says("connected"), _patience, cancel).ConfigureAwait(false);
            var connectSeconds = clock.Elapsed.TotalSeconds;
            int[] processIds = [server.ProcessId, .. children.Select(child => child.ProcessId)];
            var cpuBefore = processIds.Sum(CpuMs);
            var done = await server.WaitForLineAsync(Says("rounds"), _patience, cancel).ConfigureAwait(false);

            var cpuMsPerRound = (processIds.Sum(CpuMs) - cpuBefore) / (rounds + WarmUp(rounds));
            var residentMb = children.Average(child => ResidentMb(child.ProcessId));
            return new BareExchangeResult(
                clients, rounds, rounds / Number(done, "seconds"), Number(done, "median_ms"), Number(done, "p99_ms"),
                cpuMsPerRound, connectSeconds, residentMb);
        }
        finally
        {
            Directory.Delete(folder, recursive: true);
        }
    }

    /// <summary>Holds the product's exchange against the bare one and prints the ratio.</summary>
    /// <param name="bare">Measured in the same run on the same machine, with as many processes.</param>
    /// <param name="realRoundsPerSecond">The product's rounds a second with coordinator, agents and ledger.</param>
    /// <returns>True when the ratio is at least <see cref="LeastRatio"/>.</returns>
    public static bool Compare(BareExchangeResult bare, double realRoundsPerSecond)
    {
        ArgumentNullException.ThrowIfNull(bare);
        ArgumentOutOfRangeException.ThrowIfNegativeOrZero(realRoundsPerSecond);
        var ratio = realRoundsPerSecond / bare.RoundsPerSecond;
        var passed = ratio >= LeastRatio;
        Console.WriteLine(string.Create(
            CultureInfo.InvariantCulture,
            $"exchange, {bare.Clients} agent processes: {realRoundsPerSecond:0} rounds/s, {ratio:0.00} of the bare exchange " +
            $"(at least {LeastRatio:0.0}): {(passed ? "reached" : "MISSED")}"));
        return passed;
    }

    /// <summary>Resident memory of a process, MB; NaN where the system does not say.</summary>
    public static double ResidentMb(int processId)
    {
        var path = $"/proc/{processId}/status";
        if (!File.Exists(path))
            return double.NaN;
        var line = File.ReadLines(path).First(line => line.StartsWith("VmRSS:", StringComparison.Ordinal));
        return double.Parse(line.Split(' ', StringSplitOptions.RemoveEmptyEntries)[1], CultureInfo.InvariantCulture) / 1024;
    }

    private static int WarmUp(int rounds) => (rounds / 10) + 1;

    private static double CpuMs(int processId)
    {
        using var process = Process.GetProcessById(processId);
        return process.TotalProcessorTime.TotalMilliseconds;
    }

    private static async Task<string> PublishAsync(bool jit, CancellationToken cancel)
    {
        var options = new BinaryOptions();
        var top = new DirectoryInfo(AppContext.BaseDirectory);
        while (!File.Exists(Path.Combine(top.FullName, "Agents.sln")))
            top = top.Parent ?? throw new InvalidOperationException("The benchmarks run from a source checkout only.");
        var isNative = !jit && Toolchain.WhyNotNative(options.SearchPath) is null;
        var artifacts = Path.Combine(top.FullName, "artifacts", isNative ? "bare" : "bare-jit");
        Directory.CreateDirectory(artifacts);
        string[] arguments = isNative ? ["-r", Toolchain.RuntimeIdentifier] : ["-p:PublishAot=false", "--self-contained", "false"];
        var failure = await new DotnetPublish(options.SearchPath, options.BuildWithin, Console.Error.WriteLine).RunAsync(
            Path.Combine(top.FullName, "tests", "Benchmarks", "BareExchange"), artifacts, arguments,
            $"Building the bare exchange {(isNative ? "ahead of time" : "for the JIT")}", cancel).ConfigureAwait(false);
        if (failure is not null)
            throw new InvalidOperationException($"The bare exchange cannot be built: {failure}");
        var output = isNative ? $"release_{Toolchain.RuntimeIdentifier}" : "release";
        var fileName = OperatingSystem.IsWindows() ? "bare-exchange.exe" : "bare-exchange";
        return Path.Combine(artifacts, "publish", "BareExchange", output, fileName);
    }

    private static void WriteIdentities(string folder, int clients)
    {
        using var authority = LabAuthority.Create(TimeSpan.FromDays(1), TimeProvider.System);
        authority.WriteCertificate(Path.Combine(folder, "authority.pem"));
        authority.WriteRevocationList(Path.Combine(folder, "revoked.crl"));
        using var coordinator = authority.Issue(new IdentityRequest(IdentityRole.Coordinator) { DnsNames = ["localhost"] });
        coordinator.Write(folder, "coordinator");
        for (var number = 0; number < clients; number++)
        {
            using var site = authority.Issue(new IdentityRequest(IdentityRole.Site, $"site-{number}"));
            site.Write(folder, $"site-{number}");
        }
    }

    private static ChildStart Start(string name, string executable, string[] arguments) => new(name, executable, arguments)
    {
        Environment = new Dictionary<string, string?> { ["DOTNET_TieredCompilation"] = "0" },
    };

    private static bool IsReady(string line) => line.StartsWith("{\"ready\":true", StringComparison.Ordinal);

    private static Func<string, bool> Says(string name) => line => line.StartsWith($"{{\"{name}\"", StringComparison.Ordinal);

    private static double Number(string json, string name)
    {
        using var document = JsonDocument.Parse(json);
        return document.RootElement.GetProperty(name).GetDouble();
    }

    private static bool TryRead(string[] args, out int[] clients, out int rounds, out int components, out bool jit)
    {
        (clients, rounds, components, jit) = ([12, 118], 1000, 1, false);
        for (var i = 0; i < args.Length; i++)
        {
            var value = i + 1 < args.Length ? args[i + 1] : "";
            switch (args[i])
            {
                case "--jit":
                    jit = true;
                    continue;
                case "--clients":
                    clients = [.. value.Split(',').Select(part => int.TryParse(part, CultureInfo.InvariantCulture, out var n) ? n : 0)];
                    break;
                case "--rounds" when int.TryParse(value, CultureInfo.InvariantCulture, out rounds):
                case "--components" when int.TryParse(value, CultureInfo.InvariantCulture, out components):
                    break;
                default:
                    return false;
            }

            i++;
        }

        return clients.All(count => count is >= 1 and <= 1000) && rounds >= 1 && components is >= 1 and <= 10_000;
    }
}
