using System.Globalization;
using System.Text;

namespace Halfvoice.Plans;

/// <summary>One thing that is wrong with a plan folder.</summary>
/// <param name="File">Name inside the folder, forward slashes; <c>.</c> for the folder itself.</param>
/// <param name="Line">Line, from 1; null where the whole file is meant.</param>
/// <param name="Column">In plan.yaml the character of the line, in a CSV file the number of the field; both from 1.</param>
/// <param name="Value">The offending text, shortened; null where there is none or where it is private.</param>
/// <param name="Rule">What must hold, or what is the matter, and what to do.</param>
/// <param name="Field">The key or column that the rule is about.</param>
/// <param name="ValueIsPrivate">True for what stands in load files: such a value is never quoted.</param>
public sealed record PlanError(
    string File,
    int? Line,
    int? Column,
    string? Value,
    string Rule,
    string? Field = null,
    bool ValueIsPrivate = false)
{
    private const int LongestQuote = 60;

    /// <summary>One line: <c>grid/lines.csv:12:4: reactance_pu is '0': must not be zero</c>.</summary>
    public string Text
    {
        get
        {
            var text = new StringBuilder(File);
            if (Line is { } line)
                text.Append(CultureInfo.InvariantCulture, $":{line}");
            if (Line is not null && Column is { } column)
                text.Append(CultureInfo.InvariantCulture, $":{column}");
            text.Append(": ");
            if (Field is not null)
                text.Append(Field);
            if (ValueIsPrivate)
                text.Append(Field is null ? "(value not shown: loads are private)" : " (value not shown: loads are private)");
            else if (Value is not null)
                text.Append(CultureInfo.InvariantCulture, $"{(Field is null ? "" : " is ")}'{Value}'");
            if (text[^1] is not ' ')
                text.Append(": ");
            return text.Append(Rule).ToString();
        }
    }

    public override string ToString() => Text;

    /// <summary>A text as it may stand in an error: one line, no control characters, at most 60 characters.</summary>
    public static string Quotable(string text)
    {
        var safe = new StringBuilder(Math.Min(text.Length, LongestQuote) + 1);
        foreach (var character in text)
        {
            if (safe.Length == LongestQuote)
                return safe.Append('…').ToString();
            safe.Append(char.IsControl(character) || char.IsSurrogate(character) || character is '\u2028' or '\u2029' ? '?' : character);
        }

        return safe.ToString();
    }
}

/// <summary>Something in a plan folder that is allowed but deserves a look.</summary>
public sealed record PlanWarning(string File, int? Line, string Message)
{
    public string Text => Line is { } line
        ? string.Create(CultureInfo.InvariantCulture, $"{File}:{line}: {Message}")
        : $"{File}: {Message}";

    public override string ToString() => Text;
}
