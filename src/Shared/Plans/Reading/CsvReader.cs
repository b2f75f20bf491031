using System.Text;

namespace Halfvoice.Plans;

/// <summary>What is wrong with the form of a CSV row.</summary>
internal enum CsvFault
{
    None,
    QuoteInsideField,
    TextAfterQuote,
    QuoteNeverClosed,
    FieldTooLong,
    TooManyFields,
}

/// <summary>
/// Splits bytes into the rows and fields of RFC 4180 (Shafranovich, 2005), with the line of every row. Memory is one row
/// of bounded size whatever the input: a field has at most 4,096 bytes, a row at most 64 fields, and what is longer is
/// a fault of that row. Written here because errors need exact places and private files must not be quoted; the
/// libraries for CSV throw with the text of the row in the message. Lines end with LF, CRLF or CR; blank lines are skipped.
/// </summary>
internal sealed class CsvReader(byte[] bytes, int start)
{
    private const int MaxFieldBytes = 4096;
    private const int MaxFields = 64;

    private readonly int[] _ends = new int[MaxFields];
    private readonly bool[] _quoted = new bool[MaxFields];
    private byte[] _row = new byte[256];
    private int _used;
    private int _at = start;
    private int _nextLine = 1;

    /// <summary>Line on which the current row starts, from 1.</summary>
    public int Line { get; private set; }

    public int FieldCount { get; private set; }

    public CsvFault Fault { get; private set; }

    /// <summary>Field of the fault, from 1.</summary>
    public int FaultField { get; private set; }

    /// <summary>A field's content without its quotes; an unquoted one without the blanks around it.</summary>
    public ReadOnlySpan<byte> Field(int index)
    {
        var from = index == 0 ? 0 : _ends[index - 1];
        var field = _row.AsSpan(from, _ends[index] - from);
        return _quoted[index] ? field : field.Trim(" \t"u8);
    }

    public string Text(int index) => Encoding.UTF8.GetString(Field(index));

    /// <summary>Moves to the next row that is not blank; false at the end.</summary>
    public bool Next()
    {
        while (_at < bytes.Length)
        {
            Line = _nextLine;
            ReadRow();
            if (FieldCount > 1 || _quoted[0] || Field(0).Length > 0 || Fault != CsvFault.None)
                return true;
        }

        return false;
    }

    private void ReadRow()
    {
        (_used, FieldCount, Fault, FaultField) = (0, 0, CsvFault.None, 0);
        while (true)
        {
            var quoted = _at < bytes.Length && bytes[_at] == (byte)'"';
            var fault = quoted ? ReadQuoted() : ReadPlain();
            if (fault == CsvFault.None && FieldCount == MaxFields)
                fault = CsvFault.TooManyFields;
            if (fault != CsvFault.None)
            {
                (Fault, FaultField) = (fault, FieldCount + 1);
                SkipLine();
                return;
            }

            _quoted[FieldCount] = quoted;
            _ends[FieldCount++] = _used;
            if (_at >= bytes.Length)
                return;
            if (bytes[_at] != (byte)',')
            {
                EndLine();
                return;
            }

            _at++;
        }
    }

    private CsvFault ReadPlain()
    {
        var rest = bytes.AsSpan(_at);
        var length = rest.IndexOfAny(",\r\n\""u8);
        if (length < 0)
            length = rest.Length;
        if (length < rest.Length && rest[length] == (byte)'"')
            return CsvFault.QuoteInsideField;
        return Take(length);
    }

    private CsvFault ReadQuoted()
    {
        var from = _used;
        _at++;
        while (true)
        {
            var length = bytes.AsSpan(_at).IndexOfAny("\"\r\n"u8);
            if (length < 0)
                return CsvFault.QuoteNeverClosed;
            var taken = Take(length);
            if (taken != CsvFault.None || _used - from > MaxFieldBytes)
                return CsvFault.FieldTooLong;
            if (bytes[_at] != (byte)'"')
            {
                EndLine();
                Put((byte)'\n');
                continue;
            }

            _at++;
            if (_at >= bytes.Length || bytes[_at] is (byte)',' or (byte)'\r' or (byte)'\n')
                return CsvFault.None;
            if (bytes[_at] != (byte)'"')
                return CsvFault.TextAfterQuote;
            Put((byte)'"');
            _at++;
        }
    }

    private CsvFault Take(int length)
    {
        if (length > MaxFieldBytes)
            return CsvFault.FieldTooLong;
        if (_used + length > _row.Length)
            Array.Resize(ref _row, Math.Max(2 * _row.Length, _used + length));
        bytes.AsSpan(_at, length).CopyTo(_row.AsSpan(_used));
        _used += length;
        _at += length;
        return CsvFault.None;
    }

    private void Put(byte value)
    {
        if (_used == _row.Length)
            Array.Resize(ref _row, 2 * _row.Length);
        _row[_used++] = value;
    }

    private void SkipLine()
    {
        var length = bytes.AsSpan(_at).IndexOfAny("\r\n"u8);
        _at = length < 0 ? bytes.Length : _at + length;
        if (_at < bytes.Length)
            EndLine();
    }

    private void EndLine()
    {
        if (bytes[_at] == (byte)'\r' && _at + 1 < bytes.Length && bytes[_at + 1] == (byte)'\n')
            _at++;
        _at++;
        _nextLine++;
    }
}
