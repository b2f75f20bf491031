using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>A range that a public number must lie in. The text of the rule and its test come from the same four values.</summary>
internal sealed record NumberRule(double Least, double Most, bool LeastIsOpen = false, bool MostIsOpen = false, string Unit = "")
{
    /// <summary>For example "above 0, at most 1000 MW".</summary>
    public string Range
    {
        get
        {
            var least = $"{(LeastIsOpen ? "above" : "at least")} {Show(Least)}";
            var most = $"{(MostIsOpen ? "below" : "at most")} {Show(Most)}";
            return $"{least}, {most}{(Unit.Length == 0 ? "" : " " + Unit)}";
        }
    }

    /// <summary>The rule as a sentence without subject if the value breaks it, else null.</summary>
    public string? Broken(double value)
    {
        if (double.IsNaN(value))
            return "must be a number, not NaN";
        if (double.IsInfinity(value))
            return "must be finite";
        var low = LeastIsOpen ? value <= Least : value < Least;
        var high = MostIsOpen ? value >= Most : value > Most;
        return low || high ? "must be " + Range : null;
    }

    private static string Show(double value) => value.ToString("#,##0.############", CultureInfo.InvariantCulture);
}
