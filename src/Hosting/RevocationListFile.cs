using System.Security.Cryptography.X509Certificates;

namespace Halfvoice.Hosting;

/// <summary>
/// The revocation list in a file, read again whenever the file changed, so that a revocation counts from the next handshake on
/// without a restart. Safe for use by several threads.
/// </summary>
internal sealed class RevocationListFile(string path, X509Certificate2 authority)
{
    private readonly Lock _gate = new();
    private (DateTime WrittenUtc, long Bytes) _read;
    private RevocationList? _list;

    /// <summary>The list as it stands now; one with a <see cref="RevocationList.Fault"/> when the file is missing or bad.</summary>
    public RevocationList Current
    {
        get
        {
            lock (_gate)
                return Refresh();
        }
    }

    private RevocationList Refresh()
    {
        try
        {
            var file = new FileInfo(path);
            if (!file.Exists)
                return Forget("the file is missing");
            if (file.Length > RevocationList.LargestBytes)
                return Forget($"it has {file.Length} bytes; {RevocationList.LargestBytes} are the limit");
            var stamp = (file.LastWriteTimeUtc, file.Length);
            if (_list is null || stamp != _read)
            {
                _list = RevocationList.Read(File.ReadAllBytes(path), authority);
                _read = stamp;
            }

            return _list;
        }
        catch (Exception failure) when (failure is IOException or UnauthorizedAccessException)
        {
            return Forget($"the file cannot be read ({failure.GetType().Name})");
        }
    }

    private RevocationList Forget(string fault)
    {
        // An older, readable state must not stand in for the list: it may lack the very revocation that matters.
        _list = null;
        return RevocationList.Unreadable(fault);
    }
}
