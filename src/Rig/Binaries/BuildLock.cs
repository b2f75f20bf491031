namespace Halfvoice.Rig.Binaries;

/// <summary>
/// Lets one process at a time build in a checkout. The system drops the lock with its holder, so that a rig that was killed
/// leaves nothing to clean up.
/// </summary>
internal sealed class BuildLock : IDisposable
{
    private static readonly TimeSpan _retryAfter = TimeSpan.FromMilliseconds(200);

    private readonly FileStream _file;

    private BuildLock(FileStream file) => _file = file;

    /// <summary>Waits for the lock.</summary>
    /// <param name="path">The lock's file; it stays.</param>
    /// <param name="within">How long to wait.</param>
    /// <param name="onWait">Called once when somebody else holds it.</param>
    /// <param name="cancel">Gives up.</param>
    /// <exception cref="BinariesException">It was not free in time.</exception>
    public static async Task<BuildLock> TakeAsync(string path, TimeSpan within, Action onWait, CancellationToken cancel)
    {
        Directory.CreateDirectory(Path.GetDirectoryName(path)!);
        var waited = System.Diagnostics.Stopwatch.StartNew();
        for (var isFirst = true; ; isFirst = false)
        {
            try
            {
                return new BuildLock(new FileStream(path, FileMode.OpenOrCreate, FileAccess.ReadWrite, FileShare.None));
            }
            catch (IOException) when (waited.Elapsed < within)
            {
                if (isFirst)
                    onWait();
            }
            catch (IOException held)
            {
                throw new BinariesException(
                    $"Another process has been building here for over {within.TotalMinutes:0} minutes (lock '{path}'). End it, or wait.",
                    held);
            }

            await Task.Delay(_retryAfter, cancel).ConfigureAwait(false);
        }
    }

    public void Dispose() => _file.Dispose();
}
