using System.Text.RegularExpressions;

namespace Halfvoice.Tests.Conventions;

/// <summary>Types and members of a C# text, found by its braces and semicolons.</summary>
internal sealed partial class CodeOutline
{
    private readonly string _code;
    private readonly List<CodeMember> _members = [];
    private readonly List<string> _types = [];
    private int _depth;
    private int _start;

    private CodeOutline(string source) => _code = CodeText.Blank(source);

    /// <summary>All members of all types, nested types' own among them. Fields are left out: a long table is no long function.</summary>
    public IReadOnlyList<CodeMember> Members => _members;

    /// <summary>Heads of the types that no other type encloses.</summary>
    public IReadOnlyList<string> TopTypes => _types;

    public static CodeOutline Of(string source)
    {
        var outline = new CodeOutline(source);
        outline.Read();
        return outline;
    }

    [GeneratedRegex(@"^((public|internal|private|protected|file|static|sealed|abstract|readonly|partial|ref|unsafe|new)\s+)*"
        + @"(class|struct|interface|enum|record|namespace)\b")]
    private static partial Regex TypeHead();

    [GeneratedRegex(@"^(\[[^\[\]]*(\[[^\[\]]*\][^\[\]]*)*\]\s*)+")]
    private static partial Regex Attributes();

    [GeneratedRegex(@"(?<![=!<>])=(?![=>])")]
    private static partial Regex Assignment();

    /// <summary>The accessors of a property that keeps its value itself.</summary>
    [GeneratedRegex(@"\{\s*((get|set|init|private|protected|internal|;)\s*)+\}")]
    private static partial Regex Accessors();

    private void Read()
    {
        var round = 0;
        for (var i = 0; i < _code.Length; i++)
        {
            switch (_code[i])
            {
                case '(' or '[':
                    round++;
                    break;
                case ')' or ']':
                    round--;
                    break;
                case ';' when round == 0:
                    Close(i);
                    break;
                case '{' when round == 0 && IsType(i, out var head):
                    if (_depth == 0 && !head.Contains("namespace ", StringComparison.Ordinal))
                        _types.Add(head);
                    _depth++;
                    _start = i + 1;
                    break;
                case '{':
                    i = Matching(i);
                    if (round == 0 && EndsAt(i))
                        Close(i);
                    break;
                case '}':
                    _depth--;
                    _start = i + 1;
                    break;
                default:
                    break;
            }
        }
    }

    private bool IsType(int brace, out string head)
    {
        (head, _) = Head(brace);
        return TypeHead().IsMatch(head);
    }

    private (string Head, int Start) Head(int end)
    {
        var raw = _code[_start..end];
        var text = raw.TrimStart();
        var bare = text[Attributes().Match(text).Length..];
        return (bare, _start + raw.Length - bare.Length);
    }

    private int Matching(int brace)
    {
        var depth = 0;
        for (var i = brace; i < _code.Length; i++)
        {
            depth += _code[i] switch { '{' => 1, '}' => -1, _ => 0 };
            if (depth == 0)
                return i;
        }

        return _code.Length - 1;
    }

    /// <summary>Whether a member ends at this closing brace: not where an expression or an initializer goes on to its semicolon.</summary>
    private bool EndsAt(int brace)
    {
        var (whole, _) = Head(brace);
        var body = whole.IndexOf('{', StringComparison.Ordinal);
        var arrow = whole.IndexOf("=>", StringComparison.Ordinal);
        var isExpression = (arrow >= 0 && arrow < body) || IsField(whole);
        return !isExpression && !_code.AsSpan(brace + 1).TrimStart().StartsWith("=");
    }

    private static bool IsField(string whole)
    {
        if (whole.Contains("operator", StringComparison.Ordinal))
            return false;
        var plain = Accessors().Replace(whole, string.Empty);
        var assigned = Assignment().Match(plain);
        var other = plain.IndexOfAny(['(', '{']);
        return assigned.Success && (other < 0 || assigned.Index < other);
    }

    private void Close(int end)
    {
        var (whole, start) = Head(end);
        _start = end + 1;
        if (TypeHead().IsMatch(whole))
        {
            if (_depth == 0 && !whole.StartsWith("namespace", StringComparison.Ordinal))
                _types.Add(whole);
            return;
        }

        if (whole.Length == 0 || IsField(whole))
            return;
        var line = 1 + _code.AsSpan(0, start).Count('\n');
        _members.Add(new CodeMember(whole.Split('{', '\n')[0].Trim(), line, 1 + _code.AsSpan(start, end - start).Count('\n')));
    }
}
