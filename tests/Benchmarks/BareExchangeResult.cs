using System.Globalization;

namespace Halfvoice.Benchmarks;

/// <summary>What a bare gRPC exchange does on this machine.</summary>
/// <param name="Clients">Client processes.</param>
/// <param name="Rounds">Rounds measured, after a warm-up.</param>
/// <param name="RoundsPerSecond">The yardstick.</param>
/// <param name="MedianMs">Median time of a round, milliseconds.</param>
/// <param name="P99Ms">99th percentile of a round, milliseconds.</param>
/// <param name="CpuMsPerRound">Processor time of server and clients for a round, ms; steadier than the clock on a busy machine.</param>
/// <param name="ConnectSeconds">From the first client's start until all have their streams open.</param>
/// <param name="ClientResidentMb">Mean resident memory of a client after the rounds, MB; NaN where it cannot be read.</param>
public sealed record BareExchangeResult(
    int Clients,
    int Rounds,
    double RoundsPerSecond,
    double MedianMs,
    double P99Ms,
    double CpuMsPerRound,
    double ConnectSeconds,
    double ClientResidentMb)
{
    /// <summary>One line for a person.</summary>
    public override string ToString() => string.Create(
        CultureInfo.InvariantCulture,
        $"bare exchange, {Clients} client processes: {RoundsPerSecond:0} rounds/s (median {MedianMs:0.00} ms, p99 {P99Ms:0.00} ms, " +
        $"{CpuMsPerRound:0.00} ms of processor time), all connected after {ConnectSeconds:0.00} s, " +
        $"{ClientResidentMb:0.0} MB resident each");
}
