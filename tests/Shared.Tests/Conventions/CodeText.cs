namespace Halfvoice.Tests.Conventions;

/// <summary>
/// C# with comments, directives and the insides of literals blanked, line by line and column by column, so that what is left
/// can be searched for braces and words without a compiler.
/// </summary>
internal sealed class CodeText
{
    private readonly string _source;
    private readonly char[] _blanked;
    private int _at;

    private CodeText(string source)
    {
        _source = source;
        _blanked = source.ToCharArray();
    }

    /// <summary>The same length and the same line ends; spaces where a literal or a comment was.</summary>
    public static string Blank(string source)
    {
        var text = new CodeText(source);
        while (text._at < source.Length)
            text.Next();
        return new string(text._blanked);
    }

    private char Peek(int ahead = 0) => _at + ahead < _source.Length ? _source[_at + ahead] : '\0';

    private void Next()
    {
        switch (Peek())
        {
            case '/' when Peek(1) == '/':
            case '#' when IsFirstOnLine():
                BlankTo(LineEnd());
                break;
            case '/' when Peek(1) == '*':
                BlankTo(After("*/", _at + 2));
                break;
            case '\'':
                BlankTo(CharacterEnd());
                break;
            case '"' or '$' or '@' when LiteralStart() is { } quote:
                BlankTo(StringEnd(quote));
                break;
            default:
                _at++;
                break;
        }
    }

    private bool IsFirstOnLine()
    {
        var i = _at - 1;
        while (i >= 0 && _source[i] is ' ' or '\t')
            i--;
        return i < 0 || _source[i] == '\n';
    }

    private int LineEnd()
    {
        var end = _source.IndexOf('\n', _at);
        return end < 0 ? _source.Length : end;
    }

    private int After(string mark, int from)
    {
        var found = _source.IndexOf(mark, Math.Min(from, _source.Length), StringComparison.Ordinal);
        return found < 0 ? _source.Length : found + mark.Length;
    }

    private int CharacterEnd()
    {
        var i = _at + 1;
        while (i < _source.Length && _source[i] is not ('\'' or '\n'))
            i += _source[i] == '\\' ? 2 : 1;
        return i + 1;
    }

    /// <summary>Index of the first quote if a string begins here, after any <c>$</c> and <c>@</c>.</summary>
    private int? LiteralStart()
    {
        var i = _at;
        while (i < _source.Length && _source[i] is '$' or '@')
            i++;
        return i < _source.Length && _source[i] == '"' ? i : null;
    }

    private int StringEnd(int quote)
    {
        var prefix = _source.AsSpan(_at, quote - _at);
        var quotes = 0;
        while (quote + quotes < _source.Length && _source[quote + quotes] == '"')
            quotes++;
        if (quotes >= 3)
            return RawEnd(quote + quotes, quotes);
        return quotes == 2 ? quote + 2 : PlainEnd(quote + 1, prefix.Contains('$'), prefix.Contains('@'));
    }

    /// <summary>A raw string ends at the next run of as many quotes, wherever the run's surplus lies.</summary>
    private int RawEnd(int from, int quotes)
    {
        var end = After(new string('"', quotes), from);
        while (end < _source.Length && _source[end] == '"')
            end++;
        return end;
    }

    private int PlainEnd(int from, bool holes, bool verbatim)
    {
        var i = from;
        while (i < _source.Length && (verbatim || _source[i] != '\n'))
        {
            if (_source[i] == '\\' && !verbatim)
                i += 2;
            else if (_source[i] == '"' && !(verbatim && i + 1 < _source.Length && _source[i + 1] == '"'))
                return i + 1;
            else if (_source[i] == '"' || (_source[i] == '{' && i + 1 < _source.Length && _source[i + 1] == '{'))
                i += 2;
            else
                i = holes && _source[i] == '{' ? HoleEnd(i + 1) : i + 1;
        }

        return Math.Min(i, _source.Length);
    }

    /// <summary>The end of an interpolation's hole, which is code and may hold strings of its own.</summary>
    private int HoleEnd(int from)
    {
        var before = _at;
        var depth = 1;
        _at = from;
        while (_at < _source.Length && depth > 0)
        {
            depth += Peek() switch { '{' => 1, '}' => -1, _ => 0 };
            Next();
        }

        var end = _at;
        _at = before;
        return end;
    }

    private void BlankTo(int end)
    {
        var stop = Math.Min(end, _source.Length);
        for (; _at < stop; _at++)
        {
            if (_blanked[_at] != '\n')
                _blanked[_at] = ' ';
        }
    }
}
