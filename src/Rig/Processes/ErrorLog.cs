using System.Text;

namespace Halfvoice.Rig.Processes;

/// <summary>Where a child's standard error goes: a file up to a limit, and the last lines in memory.</summary>
internal sealed class ErrorLog : IDisposable
{
    private readonly Queue<string> _last = new();
    private readonly FileStream? _file;
    private long _roomBytes;

    /// <summary>Opens the file for appending and makes its folder where needed.</summary>
    public ErrorLog(string? path, long limitBytes)
    {
        _roomBytes = limitBytes;
        if (path is null)
            return;
        Directory.CreateDirectory(Path.GetDirectoryName(Path.GetFullPath(path))!);
        _file = new FileStream(path, FileMode.Append, FileAccess.Write, FileShare.ReadWrite);
    }

    public IReadOnlyList<string> LastLines
    {
        get
        {
            lock (_last)
                return [.. _last];
        }
    }

    /// <summary>Keeps a line; called by one thread at a time.</summary>
    public void Add(string line)
    {
        lock (_last)
        {
            _last.Enqueue(line);
            if (_last.Count > ChildExit.KeptErrorLines)
                _last.Dequeue();
        }

        if (_file is null || _roomBytes <= 0)
            return;
        var bytes = Encoding.UTF8.GetBytes(line + "\n");
        _roomBytes -= bytes.Length;
        _file.Write(_roomBytes >= 0 ? bytes : "(the rest is left out: the limit of this log is reached)\n"u8);
        _file.Flush();
    }

    public void Dispose() => _file?.Dispose();
}
