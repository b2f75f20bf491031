using System.Text;
using YamlDotNet.Core;
using YamlDotNet.Core.Events;

namespace Halfvoice.Plans;

/// <summary>A piece of plan.yaml and where it starts; line and column from 1.</summary>
internal abstract record YamlPart(int Line, int Column);

/// <summary>A single value; <paramref name="IsEmpty"/> for nothing, <c>~</c> or <c>null</c> without quotation marks.</summary>
internal sealed record YamlScalar(int Line, int Column, string Text, bool IsEmpty) : YamlPart(Line, Column);

internal sealed record YamlList(int Line, int Column, List<YamlPart> Items) : YamlPart(Line, Column);

/// <summary>Keys in file order, repeated ones included: telling about them is the reader's business.</summary>
internal sealed record YamlMap(int Line, int Column, List<(YamlScalar Key, YamlPart Value)> Entries) : YamlPart(Line, Column);

/// <summary>
/// Builds the tree of plan.yaml from the events of the YAML parser. The ready-made tree of the library stops at the
/// first repeated key and follows aliases; this one keeps going, takes no aliases, and is bounded in depth and size.
/// </summary>
internal sealed class YamlTree
{
    private const int MaxDepth = 12;
    private const int MaxParts = 200_000;

    private readonly IParser _parser;
    private readonly FileProblems _problems;
    private int _parts;
    private int _line = 1;

    private YamlTree(IParser parser, FileProblems problems)
    {
        _parser = parser;
        _problems = problems;
    }

    /// <summary>The top-level map, or null with the error noted.</summary>
    public static YamlMap? Read(byte[] bytes, FileProblems problems)
    {
        if (!TextEncoding.Check(bytes, problems))
            return null;
        var start = TextEncoding.Start(bytes);
        var text = Encoding.UTF8.GetString(bytes, start, bytes.Length - start);
        var tree = new YamlTree(new Parser(new StringReader(text)), problems);
        try
        {
            return tree.ReadDocument();
        }
        catch (TooDeepException tooDeep)
        {
            problems.Add(tooDeep.Line, tooDeep.Column, null, null, tooDeep.Message);
        }
        catch (YamlException wrong)
        {
            // The start is that of the last token understood; the end is where the parser stumbled.
            problems.Add((int)wrong.End.Line, (int)wrong.End.Column, null, null, "is not valid YAML: " + PlanError.Quotable(wrong.Message));
        }
        catch (Exception wrong) when (wrong is InvalidOperationException or ArgumentException or IndexOutOfRangeException
            or FormatException)
        {
            // On some malformed texts the scanner of the library fails an assertion of its own instead of saying where.
            problems.Add(tree._line, null, null, null, "is not valid YAML: the text after this line cannot be understood");
        }

        return null;
    }

    private YamlMap? ReadDocument()
    {
        _parser.Consume<StreamStart>();
        if (!_parser.TryConsume<DocumentStart>(out _))
        {
            _problems.Add(1, 1, null, null, "is empty: it needs at least 'name' and 'base_mva'");
            return null;
        }

        var top = ReadPart(1);
        _parser.Consume<DocumentEnd>();
        if (_parser.TryConsume<DocumentStart>(out var second))
            _problems.Add((int)second.Start.Line, (int)second.Start.Column, null, null, "starts a second document: a plan is one document");
        if (top is YamlMap map)
            return map;
        _problems.Add(top.Line, top.Column, null, null, "must be keys with values, such as 'name: North shore'");
        return null;
    }

    private YamlPart ReadPart(int depth)
    {
        var at = _parser.Current!;
        var (line, column) = ((int)at.Start.Line, (int)at.Start.Column);
        _line = line;
        if (depth > MaxDepth || ++_parts > MaxParts)
            throw new TooDeepException(line, column);
        if (_parser.TryConsume<Scalar>(out var scalar))
            return Leaf(line, column, scalar);
        if (_parser.TryConsume<AnchorAlias>(out _))
        {
            _problems.Add(line, column, null, null, "uses an alias: write the value out");
            return new YamlScalar(line, column, "", true);
        }

        if (_parser.TryConsume<SequenceStart>(out _))
        {
            var items = new List<YamlPart>();
            while (!_parser.TryConsume<SequenceEnd>(out _))
                items.Add(ReadPart(depth + 1));
            return new YamlList(line, column, items);
        }

        _parser.Consume<MappingStart>();
        var entries = new List<(YamlScalar, YamlPart)>();
        while (!_parser.TryConsume<MappingEnd>(out _))
        {
            var key = ReadPart(depth + 1);
            var value = ReadPart(depth + 1);
            if (key is YamlScalar plain)
                entries.Add((plain, value));
            else
                _problems.Add(key.Line, key.Column, null, null, "has a list or a map as a key: a key is a plain word");
        }

        return new YamlMap(line, column, entries);
    }

    private static YamlScalar Leaf(int line, int column, Scalar scalar) => new(
        line,
        column,
        scalar.Value,
        scalar.Style == ScalarStyle.Plain && scalar.Value is "" or "~" or "null" or "Null" or "NULL");

    /// <summary>Ends the walk through a document that no plan would ever be.</summary>
    private sealed class TooDeepException(int line, int column) : Exception("is nested too deeply or has too many parts")
    {
        public int Line => line;

        public int Column => column;
    }
}
