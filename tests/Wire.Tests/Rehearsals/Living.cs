using System.Diagnostics;
using System.Globalization;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>Processes that are not our children, by what the system says of them.</summary>
internal static class Living
{
    /// <summary>Children of a process, with the names of their programs.</summary>
    public static IReadOnlyList<(int ProcessId, string Program)> ChildrenOf(int parent)
    {
        var found = new List<(int, string)>();
        foreach (var folder in Directory.EnumerateDirectories("/proc"))
        {
            if (int.TryParse(Path.GetFileName(folder), NumberStyles.None, CultureInfo.InvariantCulture, out var id) && ParentOf(id) == parent)
                found.Add((id, ProgramOf(id)));
        }

        return found;
    }

    /// <summary>Memory of a process that is really in use, kB.</summary>
    public static long ResidentKilobytes(int processId) => File.ReadLines($"/proc/{processId}/status")
        .Where(line => line.StartsWith("VmRSS:", StringComparison.Ordinal))
        .Select(line => long.Parse(line.Split((char[]?)null, StringSplitOptions.RemoveEmptyEntries)[1], CultureInfo.InvariantCulture))
        .Single();

    /// <summary>Waits until none of the processes lives any more.</summary>
    public static async Task GoneAsync(IEnumerable<Process> processes, CancellationToken cancel)
    {
        foreach (var process in processes)
            await process.WaitForExitAsync(cancel).WaitAsync(LineProcess.Patience, cancel);
    }

    private static int ParentOf(int id)
    {
        try
        {
            // pid (name) state ppid ...; the name may hold spaces and parentheses.
            var stat = File.ReadAllText($"/proc/{id}/stat");
            return int.Parse(stat[(stat.LastIndexOf(')') + 2)..].Split(' ')[1], CultureInfo.InvariantCulture);
        }
        catch (Exception gone) when (gone is IOException or UnauthorizedAccessException)
        {
            return -1;
        }
    }

    private static string ProgramOf(int id)
    {
        try
        {
            return File.ReadAllText($"/proc/{id}/cmdline").Split('\0')[0];
        }
        catch (Exception gone) when (gone is IOException or UnauthorizedAccessException)
        {
            return "";
        }
    }
}
