using System.Text.Json;
using System.Text.Json.Serialization;

namespace Halfvoice.Rehearsal;

/// <summary>Each acceptance limit with its measured value, pass or fail, and what each cycle came to.</summary>
public sealed record Verdict
{
    /// <summary>Version of this form.</summary>
    public int Format { get; init; } = 1;

    public required bool Passed { get; init; }

    public required string Plan { get; init; }

    public required IReadOnlyList<LimitResult> Limits { get; init; }

    public required IReadOnlyList<CycleResult> Cycles { get; init; }

    /// <summary>Seed of the run; null where nothing was seeded, as in every run with real noise and no faults.</summary>
    public long? Seed { get; init; }

    /// <summary>Commit that the binaries were built from; "unknown" outside a checkout.</summary>
    public required string Commit { get; init; }

    /// <summary>The options of the run, by name.</summary>
    public required IReadOnlyDictionary<string, string> Options { get; init; }

    /// <summary>What the reader must know to read the numbers rightly.</summary>
    public required IReadOnlyList<string> Notes { get; init; }

    public string ToJson() => JsonSerializer.Serialize(this, VerdictJson.Default.Verdict);
}

/// <summary>One limit.</summary>
/// <param name="Measured">Null where nothing could be measured; the limit has then failed.</param>
public sealed record LimitResult(string Name, double Limit, double? Measured, string Unit, bool Passed);

/// <summary>What a cycle came to.</summary>
public sealed record CycleResult
{
    public required int Cycle { get; init; }

    public required bool Settled { get; init; }

    /// <summary>How the cycle ended, in one word.</summary>
    public required string End { get; init; }

    public required int Rounds { get; init; }

    /// <summary>From the first ask to the outcome, s.</summary>
    public required double Seconds { get; init; }

    /// <summary>Cost of the central optimum, $/h.</summary>
    public required double OptimumPerHour { get; init; }

    /// <summary>Delivered cost, $/h; null where no dispatch was delivered.</summary>
    public double? CostPerHour { get; init; }

    /// <summary>Delivered cost over optimum, less 1, as a fraction.</summary>
    public double? CostGap { get; init; }

    /// <summary>Imbalance that generators took by participation, MW.</summary>
    public double? ReserveMw { get; init; }

    /// <summary>Largest |flow| / limit, as a fraction.</summary>
    public double? WorstLoading { get; init; }

    /// <summary>The line of <see cref="WorstLoading"/>.</summary>
    public string? WorstLine { get; init; }

    /// <summary>Bytes of all messages in the cycle, both directions, gRPC framing included, TLS and TCP not.</summary>
    public required long Bytes { get; init; }

    /// <summary>Privacy spent in the cycle by site; empty where nothing is promised.</summary>
    public required IReadOnlyDictionary<string, double> EpsilonBySite { get; init; }
}

/// <summary>The verdict's JSON: snake_case, without reflection.</summary>
[JsonSourceGenerationOptions(PropertyNamingPolicy = JsonKnownNamingPolicy.SnakeCaseLower, WriteIndented = true)]
[JsonSerializable(typeof(Verdict))]
public sealed partial class VerdictJson : JsonSerializerContext
{
}
