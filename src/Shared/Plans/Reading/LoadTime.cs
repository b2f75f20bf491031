using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>The time of a snapshot: HH:MM, or a date and time of ISO 8601.</summary>
/// <param name="Instant">Comparable within one kind.</param>
/// <param name="Kind">0 for HH:MM, 1 for a date and time without offset, 2 for one with an offset.</param>
internal readonly record struct LoadTime(DateTimeOffset Instant, int Kind)
{
    private static readonly string[] Local = ["yyyy-MM-dd'T'HH:mm", "yyyy-MM-dd'T'HH:mm:ss", "yyyy-MM-dd HH:mm", "yyyy-MM-dd HH:mm:ss"];

    private static readonly string[] WithOffset =
        ["yyyy-MM-dd'T'HH:mm'Z'", "yyyy-MM-dd'T'HH:mm:ss'Z'", "yyyy-MM-dd'T'HH:mmzzz", "yyyy-MM-dd'T'HH:mm:sszzz"];

    public static bool TryRead(string text, out LoadTime time)
    {
        var culture = CultureInfo.InvariantCulture;
        if (TimeOnly.TryParseExact(text, "HH:mm", culture, DateTimeStyles.None, out var clock))
        {
            time = new LoadTime(new DateTimeOffset(2000, 1, 1, clock.Hour, clock.Minute, 0, TimeSpan.Zero), 0);
            return true;
        }

        var isLocal = DateTimeOffset.TryParseExact(text, Local, culture, DateTimeStyles.AssumeUniversal, out var instant);
        var isAbsolute = !isLocal && DateTimeOffset.TryParseExact(text, WithOffset, culture, DateTimeStyles.AssumeUniversal, out instant);
        time = new LoadTime(instant, isLocal ? 1 : 2);
        return isLocal || isAbsolute;
    }
}
