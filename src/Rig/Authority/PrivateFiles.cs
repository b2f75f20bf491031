using System.Text;

namespace Halfvoice.Rig.Authority;

/// <summary>
/// Files that only their owner may read. The mode is set when a file is made, so that there is no moment in which others could
/// open it, and a file is put in place as a whole, so that no reader sees half of one.
/// </summary>
internal static class PrivateFiles
{
    private const UnixFileMode FolderMode = UnixFileMode.UserRead | UnixFileMode.UserWrite | UnixFileMode.UserExecute;
    private const UnixFileMode FileMode0600 = UnixFileMode.UserRead | UnixFileMode.UserWrite;

    /// <summary>Makes a folder with mode 0700, or takes the rights of others from one that is there.</summary>
    public static void MakeFolder(string path)
    {
        if (OperatingSystem.IsWindows())
        {
            Directory.CreateDirectory(path);
            return;
        }

        Directory.CreateDirectory(path, FolderMode);
        File.SetUnixFileMode(path, FolderMode);
    }

    /// <summary>Writes a file with mode 0600, in place of any former one.</summary>
    public static void Write(string path, string content)
    {
        var options = new FileStreamOptions { Mode = FileMode.CreateNew, Access = FileAccess.Write };
        if (!OperatingSystem.IsWindows())
            options.UnixCreateMode = FileMode0600;
        var temporary = $"{path}.{Guid.NewGuid():N}.new";
        using (var stream = new FileStream(temporary, options))
        {
            stream.Write(Encoding.UTF8.GetBytes(content));
            stream.Flush(flushToDisk: true);
        }

        File.Move(temporary, path, overwrite: true);
    }
}
