using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>A column of a plan's CSV file.</summary>
internal sealed record CsvColumn(string Name, bool Required = true);

/// <summary>
/// A CSV file of the plan as a table with named columns in any order. Every fault of form becomes a typed error with
/// file, line and field; rows come out one at a time.
/// </summary>
internal sealed class CsvSheet
{
    private readonly CsvReader _reader;
    private readonly CsvColumn[] _columns;
    private readonly FileProblems _problems;
    private readonly int[] _fieldOf;
    private readonly int _maxRows;
    private int _headerFields;
    private int _rows;

    private CsvSheet(CsvReader reader, CsvColumn[] columns, FileProblems problems, int maxRows)
    {
        _reader = reader;
        _columns = columns;
        _problems = problems;
        _maxRows = maxRows;
        _fieldOf = new int[columns.Length];
        Array.Fill(_fieldOf, -1);
    }

    public FileProblems Problems => _problems;

    public int Line => _reader.Line;

    /// <summary>True if the row's form is wrong; its error is noted and its fields may be missing or shifted.</summary>
    public bool RowIsBroken { get; private set; }

    /// <summary>Opens a file and reads its header; null if there is nothing to go on with (the errors say why).</summary>
    public static CsvSheet? Open(IPlanFiles files, FileProblems problems, CsvColumn[] columns, int maxRows)
    {
        var content = files.Read(problems.File, PlanFileRules.MaxCsvBytes);
        if (content.Bytes is not { } bytes)
        {
            problems.Whole(content.Problem ?? "cannot be read");
            return null;
        }

        if (!TextEncoding.Check(bytes, problems))
            return null;
        var sheet = new CsvSheet(new CsvReader(bytes, TextEncoding.Start(bytes)), columns, problems, maxRows);
        return sheet.ReadHeader() ? sheet : null;
    }

    public bool Has(int column) => _fieldOf[column] >= 0;

    /// <summary>Moves to the next row; false at the end of the file or where reading is given up.</summary>
    public bool Next()
    {
        if (_problems.IsFull)
        {
            _problems.StoppedAt(_reader.Line);
            return false;
        }

        if (!_reader.Next())
            return false;
        if (_rows++ == _maxRows)
        {
            _problems.Add(_reader.Line, null, null, null, string.Create(
                CultureInfo.InvariantCulture,
                $"has more than {_maxRows:#,##0} rows: the rest was not read"));
            return false;
        }

        RowIsBroken = true;
        if (_reader.Fault != CsvFault.None)
            _problems.Add(_reader.Line, _reader.FaultField, null, null, Describe(_reader.Fault));
        else if (_reader.FieldCount != _headerFields)
            _problems.Add(_reader.Line, null, null, null, string.Create(
                CultureInfo.InvariantCulture,
                $"has {_reader.FieldCount} fields where the header has {_headerFields}"));
        else
            RowIsBroken = false;
        return true;
    }

    /// <summary>The text of a column in this row; empty where the column or the field is absent.</summary>
    public string Text(int column) =>
        _fieldOf[column] is var field && field >= 0 && field < _reader.FieldCount ? _reader.Text(field) : "";

    /// <summary>Notes that a field breaks a rule.</summary>
    public void Reject(int column, string rule) => _problems.Add(Line, _fieldOf[column] + 1, _columns[column].Name, Text(column), rule);

    /// <summary>A number within the rule; null, with an error noted, if it is not one.</summary>
    public double? Number(int column, NumberRule rule)
    {
        var text = Text(column);
        if (text.Length == 0)
        {
            Reject(column, "must not be blank: it needs a number " + rule.Range);
            return null;
        }

        if (!double.TryParse(text, NumberStyles.Float, CultureInfo.InvariantCulture, out var value))
        {
            Reject(column, "must be a number with a decimal point, such as 12.5");
            return null;
        }

        if (rule.Broken(value) is not { } broken)
            return value;
        Reject(column, broken);
        return null;
    }

    /// <summary>As <see cref="Number"/>, but an empty field or an absent column is no error and gives null.</summary>
    public double? OptionalNumber(int column, NumberRule rule) => Text(column).Length == 0 ? null : Number(column, rule);

    private bool ReadHeader()
    {
        if (!_reader.Next())
        {
            _problems.Add(1, 1, null, null, "is empty: it needs a header row " + HeaderText());
            return false;
        }

        if (_reader.Fault != CsvFault.None)
        {
            _problems.Add(_reader.Line, _reader.FaultField, null, null, Describe(_reader.Fault));
            return false;
        }

        _headerFields = _reader.FieldCount;
        if (!Enumerable.Range(0, _headerFields).Any(field => IndexOf(_reader.Text(field)) >= 0))
        {
            _problems.Add(_reader.Line, 1, null, null, "has no known column: the first row must be the header " + HeaderText());
            return false;
        }

        for (var field = 0; field < _headerFields; field++)
            ReadHeaderField(field);
        var missing = _columns.Where((column, i) => column.Required && _fieldOf[i] < 0).ToArray();
        foreach (var column in missing)
            _problems.Add(_reader.Line, null, null, null, $"has no column '{column.Name}': the header is {HeaderText()}");
        return missing.Length == 0;
    }

    private int IndexOf(string name) => Array.FindIndex(_columns, column => column.Name == name);

    private void ReadHeaderField(int field)
    {
        var name = _reader.Text(field);
        var index = IndexOf(name);
        if (index < 0)
        {
            // Without a header row the first row holds values, so in a load file even this text stays unquoted.
            var hint = _problems.File.StartsWith(PlanFileRules.LoadFolder, StringComparison.Ordinal)
                ? ""
                : NearestName.Hint(name, _columns.Select(column => column.Name));
            _problems.Add(_reader.Line, field + 1, "column", name, $"is not known{hint}: the header is {HeaderText()}");
            return;
        }

        if (_fieldOf[index] >= 0)
            _problems.Add(_reader.Line, field + 1, "column", name, "is there twice");
        _fieldOf[index] = field;
    }

    private string HeaderText() => "'" + string.Join(',', _columns.Select(column => column.Name)) + "'"
        + (_columns.Any(column => !column.Required)
            ? " (optional: " + string.Join(", ", _columns.Where(column => !column.Required).Select(column => column.Name)) + ")"
            : "");

    private static string Describe(CsvFault fault) => fault switch
    {
        CsvFault.QuoteInsideField => "has a quotation mark inside a field: put the whole field in quotation marks and double those inside",
        CsvFault.TextAfterQuote => "has text after a closing quotation mark: a quotation mark inside a quoted field is doubled",
        CsvFault.QuoteNeverClosed => "has a quotation mark that is never closed",
        CsvFault.FieldTooLong => "has a field longer than 4,096 bytes",
        CsvFault.TooManyFields => "has more than 64 fields",
        _ => throw new ArgumentOutOfRangeException(nameof(fault)),
    };
}
