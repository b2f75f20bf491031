using System.Globalization;
using System.Text;
using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>Power at a bus that finds no place.</summary>
/// <param name="Bus">Index of the bus.</param>
/// <param name="Mw">Amount, above 0.</param>
public readonly record struct UnservedAt(int Bus, double Mw);

/// <summary>
/// Why a load cannot be served: the least total of load left out and power thrown away (both at one price, so that the
/// total is unique; where it falls need not be), and the line limits that would reduce it if raised.
/// </summary>
public sealed record Infeasibility
{
    private const int MaxNames = 10;

    /// <summary>Least total of <see cref="Shed"/> and <see cref="Spilled"/>, MW.</summary>
    public required double UnservedMw { get; init; }

    /// <summary>Load that cannot be served, largest first.</summary>
    public required IReadOnlyList<UnservedAt> Shed { get; init; }

    /// <summary>Generation (or negative load) that finds no taker, largest first.</summary>
    public required IReadOnlyList<UnservedAt> Spilled { get; init; }

    /// <summary>Lines at their limit whose relief would help, most helpful first.</summary>
    public required IReadOnlyList<int> LimitingLines { get; init; }

    /// <summary>By how much load exceeds what the generators can give at most, over islands where it does, MW.</summary>
    public required double CapacityShortMw { get; init; }

    /// <summary>By how much the generators give at least exceeds load, over islands where it does, MW.</summary>
    public required double MinimumExcessMw { get; init; }

    /// <summary>The explanation in MW and by the names of the network.</summary>
    public string Describe(Network network)
    {
        var text = new StringBuilder();
        if (Shed.Count > 0)
        {
            text.Append(Mw(Sum(Shed))).Append(" of load cannot be served: ").Append(Names(network, Shed)).Append('.');
        }

        if (Spilled.Count > 0)
        {
            Space(text).Append(Mw(Sum(Spilled))).Append(" of generation finds no taker: ").Append(Names(network, Spilled)).Append('.');
        }

        if (CapacityShortMw > 0)
        {
            Space(text).Append("Load exceeds what the generators that it is connected to can give at most by ")
                .Append(Mw(CapacityShortMw)).Append('.');
        }

        if (MinimumExcessMw > 0)
        {
            Space(text).Append("The least that the generators can give exceeds the load that they are connected to by ")
                .Append(Mw(MinimumExcessMw)).Append('.');
        }

        if (LimitingLines.Count > 0)
        {
            var lines = LimitingLines.Take(MaxNames)
                .Select(l => $"{network.Lines[l].Name} ({Mw(network.Lines[l].LimitMw)})");
            Space(text).Append("Lines at their limit that hold it back: ").AppendJoin(", ", lines)
                .Append(More(LimitingLines.Count)).Append('.');
        }

        return text.ToString();
    }

    private static StringBuilder Space(StringBuilder text) => text.Length > 0 ? text.Append(' ') : text;

    private static double Sum(IReadOnlyList<UnservedAt> amounts) => amounts.Sum(amount => amount.Mw);

    private static string Names(Network network, IReadOnlyList<UnservedAt> amounts) =>
        string.Join(", ", amounts.Take(MaxNames).Select(amount => $"{Mw(amount.Mw)} at {network.Buses[amount.Bus].Name}"))
        + More(amounts.Count);

    private static string More(int count) =>
        count > MaxNames ? string.Create(CultureInfo.InvariantCulture, $" and {count - MaxNames} more") : "";

    private static string Mw(double value) =>
        value.ToString(Math.Abs(value) >= 0.1 ? "0.0" : "0.0####", CultureInfo.InvariantCulture) + " MW";
}
