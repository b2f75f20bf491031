using System.Globalization;
using System.Text;
using System.Text.Unicode;

namespace Halfvoice.Plans;

/// <summary>Plan files are UTF-8, with or without a byte order mark. Says where a file is not.</summary>
internal static class TextEncoding
{
    private static ReadOnlySpan<byte> Mark => [0xEF, 0xBB, 0xBF];

    /// <summary>Bytes to skip at the start: 3 for a byte order mark, else 0.</summary>
    public static int Start(ReadOnlySpan<byte> bytes) => bytes.StartsWith(Mark) ? Mark.Length : 0;

    /// <summary>Notes an error and returns false if the bytes are not UTF-8 text.</summary>
    public static bool Check(ReadOnlySpan<byte> bytes, FileProblems problems)
    {
        if (bytes is [0xFF, 0xFE, ..] or [0xFE, 0xFF, ..])
        {
            problems.Add(1, 1, null, null, "is UTF-16 text: save it as UTF-8");
            return false;
        }

        var zero = bytes.IndexOf((byte)0);
        var bad = Utf8.IsValid(bytes) ? -1 : FirstInvalid(bytes);
        if (zero < 0 && bad < 0)
            return true;
        var isZero = bad < 0 || (zero >= 0 && zero < bad);
        var at = isZero ? zero : bad;
        var line = 1 + bytes[..at].Count((byte)'\n');
        problems.Add(line, null, null, null, string.Create(
            CultureInfo.InvariantCulture,
            $"is not UTF-8 text: {(isZero ? "a zero byte" : "an invalid byte")} at byte offset {at}: save the file as UTF-8"));
        return false;
    }

    private static int FirstInvalid(ReadOnlySpan<byte> bytes)
    {
        var at = 0;
        while (at < bytes.Length)
        {
            if (Rune.DecodeFromUtf8(bytes[at..], out _, out var length) != System.Buffers.OperationStatus.Done)
                return at;
            at += length;
        }

        return -1;
    }
}
