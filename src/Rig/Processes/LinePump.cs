using System.Text;

namespace Halfvoice.Rig.Processes;

/// <summary>
/// Reads a child's output to its end and hands on its lines. It always reads on, also when a line is too long or the receiver
/// failed, because a child whose pipe nobody empties stops at its next write.
/// </summary>
internal sealed class LinePump(Stream source, Action<string> onLine)
{
    /// <summary>Longer lines are cut here, bytes; the rest of such a line is thrown away.</summary>
    public const int LongestLineBytes = 64 << 10;

    private readonly byte[] _line = new byte[LongestLineBytes];
    private int _length;
    private Exception? _failure;

    /// <summary>Runs until end of file.</summary>
    /// <returns>The first exception that the receiver threw, or null.</returns>
    public async Task<Exception?> RunAsync()
    {
        var chunk = new byte[4096];
        try
        {
            int count;
            while ((count = await source.ReadAsync(chunk).ConfigureAwait(false)) > 0)
                Take(chunk.AsSpan(0, count));
        }
        catch (Exception broken) when (broken is IOException or ObjectDisposedException)
        {
            // The pipe went away under us, which is how output ends when a child is disposed of.
        }

        if (_length > 0)
            EndLine();
        return _failure;
    }

    private void Take(ReadOnlySpan<byte> bytes)
    {
        while (!bytes.IsEmpty)
        {
            var end = bytes.IndexOf((byte)'\n');
            Append(end < 0 ? bytes : bytes[..end]);
            if (end < 0)
                return;
            EndLine();
            bytes = bytes[(end + 1)..];
        }
    }

    private void Append(ReadOnlySpan<byte> bytes)
    {
        var room = Math.Min(bytes.Length, LongestLineBytes - _length);
        bytes[..room].CopyTo(_line.AsSpan(_length));
        _length += room;
    }

    private void EndLine()
    {
        var text = Encoding.UTF8.GetString(_line, 0, _length).TrimEnd('\r');
        _length = 0;
        if (_failure is not null)
            return;
        try
        {
            onLine(text);
        }
#pragma warning disable CA1031 // The receiver's failure is kept and reported with the child's exit; reading has to go on.
        catch (Exception failure)
#pragma warning restore CA1031
        {
            _failure = failure;
        }
    }
}
