using Halfvoice.Plans;

namespace Halfvoice.Rig.PlanFiles;

/// <summary>
/// A plan folder on disk. Lists the folder itself, <c>grid</c> and <c>loads</c>, nothing deeper, and reads files up to
/// the size that is asked for. What a user can cause becomes a problem in words, without the place of the folder.
/// </summary>
public sealed class FolderPlanFiles(string folder) : IPlanFiles
{
    private const int MostFiles = 100_000;

    private static readonly string[] Parts = ["", "grid/", "loads/"];

    public PlanFileNames List()
    {
        if (File.Exists(folder))
            return new PlanFileNames([], "is a file: a plan is a folder");
        if (!Directory.Exists(folder))
            return new PlanFileNames([], "is not there: give the path of a plan folder");
        try
        {
            var names = new List<string>();
            foreach (var part in Parts.Where(part => Directory.Exists(Path.Combine(folder, part))))
            {
                foreach (var path in Directory.EnumerateFiles(Path.Combine(folder, part)))
                {
                    if (names.Count == MostFiles)
                        return new PlanFileNames([], "holds more than 100,000 files: it is no plan folder");
                    names.Add(part + Path.GetFileName(path));
                }
            }

            return new PlanFileNames(names);
        }
        catch (Exception error) when (error is IOException or UnauthorizedAccessException)
        {
            return new PlanFileNames([], Reason(error));
        }
    }

    public PlanFileContent Read(string name, int maxBytes)
    {
        try
        {
            using var stream = new FileStream(Path.Combine(folder, name), FileMode.Open, FileAccess.Read, FileShare.ReadWrite, 1);
            if (stream.CanSeek && stream.Length > maxBytes)
                return new PlanFileContent(null, PlanFileRules.TooLarge(stream.Length, maxBytes));
            return ReadAll(stream, maxBytes);
        }
        catch (Exception error) when (error is IOException or UnauthorizedAccessException or NotSupportedException)
        {
            return new PlanFileContent(null, Reason(error));
        }
    }

    private static PlanFileContent ReadAll(FileStream stream, int maxBytes)
    {
        // A file may grow while it is read, and some files do not know their length: the cap holds for both.
        var bytes = new byte[stream.CanSeek ? (int)stream.Length : 4096];
        var used = 0;
        while (true)
        {
            if (used == bytes.Length)
            {
                if (stream.ReadByte() is var next && next < 0)
                    break;
                if (used == maxBytes)
                    return new PlanFileContent(null, PlanFileRules.TooLarge(used + 1L, maxBytes));
                Array.Resize(ref bytes, (int)Math.Min(maxBytes, Math.Max(4096, 2L * used)));
                bytes[used++] = (byte)next;
            }

            var got = stream.Read(bytes, used, bytes.Length - used);
            if (got == 0 && used < bytes.Length)
                break;
            used += got;
        }

        return new PlanFileContent(used == bytes.Length ? bytes : bytes[..used]);
    }

    private static string Reason(Exception error) => error switch
    {
        FileNotFoundException or DirectoryNotFoundException => "is missing",
        UnauthorizedAccessException => "cannot be read: access is denied, or it is a folder",
        PathTooLongException => "cannot be read: its path is too long",
        _ => "cannot be read: the device or file system reports an error",
    };
}
