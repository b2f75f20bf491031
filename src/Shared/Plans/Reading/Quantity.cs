using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>Numbers, durations and fractions as plan files write them: invariant culture, shortest text that reads back the same.</summary>
internal static class Quantity
{
    // Longest unit first, so that "5ms" is not taken for metres or minutes.
    private static readonly (string Suffix, long Ticks)[] DurationUnits =
    [
        ("ms", TimeSpan.TicksPerMillisecond),
        ("s", TimeSpan.TicksPerSecond),
        ("m", TimeSpan.TicksPerMinute),
        ("h", TimeSpan.TicksPerHour),
    ];

    public static bool TryNumber(string text, out double value) =>
        double.TryParse(text, NumberStyles.Float, CultureInfo.InvariantCulture, out value);

    public static string Number(double value) => value.ToString("R", CultureInfo.InvariantCulture);

    /// <summary>"600ms", "2s", "5m", "1h"; decimals are allowed, a missing unit is not.</summary>
    public static bool TryDuration(string text, out TimeSpan value)
    {
        value = default;
        foreach (var (suffix, unit) in DurationUnits)
        {
            if (!text.EndsWith(suffix, StringComparison.Ordinal))
                continue;
            if (!TryNumber(text[..^suffix.Length].TrimEnd(), out var count) || !double.IsFinite(count))
                return false;
            var ticks = Math.Round(count * unit);
            if (Math.Abs(ticks) > TimeSpan.TicksPerDay * 10_000.0)
                return false;
            value = TimeSpan.FromTicks((long)ticks);
            return true;
        }

        return false;
    }

    public static string Duration(TimeSpan value)
    {
        for (var i = DurationUnits.Length - 1; i > 0; i--)
        {
            if (value != TimeSpan.Zero && value.Ticks % DurationUnits[i].Ticks == 0)
                return Whole(value.Ticks / DurationUnits[i].Ticks) + DurationUnits[i].Suffix;
        }

        return value.TotalMilliseconds.ToString("0.####", CultureInfo.InvariantCulture) + "ms";
    }

    /// <summary>"0.5%" or 0.005.</summary>
    public static bool TryFraction(string text, out double value)
    {
        if (!text.EndsWith('%'))
            return TryNumber(text, out value);
        var percent = text[..^1].TrimEnd();

        // Decimal arithmetic keeps 0.3 % equal to 0.003, which a division by 100 in binary would not.
        if (decimal.TryParse(percent, NumberStyles.Float, CultureInfo.InvariantCulture, out var exact))
        {
            value = (double)(exact / 100m);
            return true;
        }

        var read = TryNumber(percent, out value);
        value /= 100;
        return read;
    }

    public static string Fraction(double value)
    {
        if (Math.Abs(value) is > 1e-9 and < 1e9)
        {
            var percent = ((decimal)value * 100m).ToString("0.##############", CultureInfo.InvariantCulture) + "%";
            if (TryFraction(percent, out var again) && again == value)
                return percent;
        }

        return Number(value);
    }

    private static string Whole(long value) => value.ToString(CultureInfo.InvariantCulture);
}
