using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>Where the two sections that matter begin and end: lines from 0, the end exclusive.</summary>
internal sealed record CdfSections(Range Buses, Range Branches)
{
    /// <summary>The sections, or null with the errors noted.</summary>
    public static CdfSections? Find(string[] lines, FileProblems problems)
    {
        var buses = Section(lines, "BUS DATA", problems);
        var branches = Section(lines, "BRANCH DATA", problems);
        return buses is { } first && branches is { } second ? new CdfSections(first, second) : null;
    }

    private static Range? Section(string[] lines, string title, FileProblems problems)
    {
        var start = Array.FindIndex(lines, line => line.TrimStart().StartsWith(title, StringComparison.OrdinalIgnoreCase));
        if (start < 0)
        {
            problems.Whole($"has no section '{title} FOLLOWS': it is not in the IEEE Common Data Format");
            return null;
        }

        // The paper closes a section with -999 in the first columns; any line that starts with -9 closes it in practice.
        var end = Array.FindIndex(lines, start + 1, line => line.StartsWith("-9", StringComparison.Ordinal));
        if (end < 0)
        {
            problems.Add(start + 1, null, null, null, $"starts '{title}' but no line -999 ends it: the file is cut off");
            return null;
        }

        WarnOfCount(lines[start], start, end, problems);
        return new Range(start + 1, end);
    }

    private static void WarnOfCount(string header, int start, int end, FileProblems problems)
    {
        var words = header.Split(' ', StringSplitOptions.RemoveEmptyEntries);
        var items = Array.FindIndex(words, word => word.StartsWith("ITEM", StringComparison.OrdinalIgnoreCase));
        var rows = end - start - 1;
        if (items <= 0 || !int.TryParse(words[items - 1], NumberStyles.None, CultureInfo.InvariantCulture, out var said) || said == rows)
            return;
        problems.Warn(start + 1, string.Create(CultureInfo.InvariantCulture, $"announces {said} items, but {rows} rows follow"));
    }
}
