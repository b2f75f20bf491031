using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>A row of a file with fixed columns, read by column or, where values drifted across columns, by order.</summary>
/// <param name="Text">The row.</param>
/// <param name="Line">Its line in the file, from 1.</param>
internal readonly record struct CdfRow(string Text, int Line)
{
    public static CdfRow Of(string text, int line) => new(text, line);

    /// <summary>
    /// The number in columns <paramref name="first"/> to <paramref name="last"/>, from 1; 0 if they are blank. NaN if
    /// they hold no number, or only a part of a word that goes on outside: then the columns have drifted.
    /// </summary>
    public double Number(int first, int last)
    {
        var (from, to) = (first - 1, Math.Min(last, Text.Length));
        if (from >= to)
            return 0;
        var field = Text.AsSpan(from, to - from).Trim();
        if (field.Length == 0)
            return 0;
        var cutAtStart = from > 0 && !IsBlank(Text[from - 1]) && !IsBlank(Text[from]);
        var cutAtEnd = to < Text.Length && !IsBlank(Text[to - 1]) && !IsBlank(Text[to]);
        return !cutAtStart && !cutAtEnd ? Parse(field) : double.NaN;
    }

    /// <summary>The values from a column on, in order; NaN for what is no number.</summary>
    public double[] Values(int firstColumn)
    {
        if (Text.Length < firstColumn)
            return [];
        return [.. Text[(firstColumn - 1)..].Split([' ', '\t'], StringSplitOptions.RemoveEmptyEntries).Select(word => Parse(word))];
    }

    /// <summary>The words in some columns with single blanks between them.</summary>
    public string Words(int first, int last)
    {
        if (Text.Length < first)
            return "";
        var words = Text[(first - 1)..Math.Min(last, Text.Length)].Split(' ', StringSplitOptions.RemoveEmptyEntries);
        return string.Join(' ', words);
    }

    private static bool IsBlank(char character) => character is ' ' or '\t';

    private static double Parse(ReadOnlySpan<char> text) =>
        double.TryParse(text, NumberStyles.Float, CultureInfo.InvariantCulture, out var value) && double.IsFinite(value)
            ? value
            : double.NaN;
}
