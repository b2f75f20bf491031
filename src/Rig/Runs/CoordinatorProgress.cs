using System.Text.Json;

namespace Halfvoice.Rig.Runs;

/// <summary>One JSON line of the coordinator's standard output.</summary>
/// <param name="Event">ready, gathering, cycle_began, round, cycle or finished.</param>
public sealed record CoordinatorProgress(string Event)
{
    public int Port { get; init; }

    public int Joined { get; init; }

    public int Cycle { get; init; }

    public int Round { get; init; }

    public int Answered { get; init; }

    public int Asked { get; init; }

    public bool Settled { get; init; }

    public string End { get; init; } = string.Empty;

    public int Rounds { get; init; }

    public double Seconds { get; init; }

    public double MismatchMw { get; init; }

    public double MismatchLimitMw { get; init; }

    public double PriceMovePerMwh { get; init; }

    public double PriceMoveLimitPerMwh { get; init; }

    /// <summary>Reads a line; null where it is none of ours.</summary>
    public static CoordinatorProgress? Read(string line)
    {
        if (!line.StartsWith("{\"event\":", StringComparison.Ordinal))
            return null;
        try
        {
            using var document = JsonDocument.Parse(line);
            var root = document.RootElement;
            return new CoordinatorProgress(Text(root, "event"))
            {
                Port = (int)Number(root, "port"),
                Joined = (int)Number(root, "joined"),
                Cycle = (int)Number(root, "cycle"),
                Round = (int)Number(root, "round"),
                Answered = (int)Number(root, "answered"),
                Asked = (int)Number(root, "asked"),
                Settled = root.TryGetProperty("settled", out var settled) && settled.ValueKind == JsonValueKind.True,
                End = Text(root, "end"),
                Rounds = (int)Number(root, "rounds"),
                Seconds = Number(root, "seconds"),
                MismatchMw = Number(root, "mismatch_mw"),
                MismatchLimitMw = Number(root, "mismatch_limit_mw"),
                PriceMovePerMwh = Number(root, "price_move_per_mwh"),
                PriceMoveLimitPerMwh = Number(root, "price_move_limit_per_mwh"),
            };
        }
        catch (JsonException)
        {
            return null;
        }
    }

    private static string Text(JsonElement root, string name) =>
        root.TryGetProperty(name, out var value) && value.ValueKind == JsonValueKind.String ? value.GetString()! : string.Empty;

    private static double Number(JsonElement root, string name) =>
        root.TryGetProperty(name, out var value) && value.ValueKind == JsonValueKind.Number ? value.GetDouble() : 0;
}
