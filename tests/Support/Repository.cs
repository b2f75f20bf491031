namespace Halfvoice.Containers;

/// <summary>Finds files of the repository from a test that runs somewhere below it.</summary>
internal static class Repository
{
    /// <summary>The folder that holds Agents.sln.</summary>
    /// <exception cref="DirectoryNotFoundException">The tests run outside a clone of the repository.</exception>
    public static string Root { get; } = FindRoot();

    /// <summary>The absolute path of a file or folder that is named relative to the top level.</summary>
    public static string PathOf(params string[] parts) => Path.Combine([Root, .. parts]);

    private static string FindRoot()
    {
        for (var folder = new DirectoryInfo(AppContext.BaseDirectory); folder is not null; folder = folder.Parent)
        {
            if (File.Exists(Path.Combine(folder.FullName, "Agents.sln")))
            {
                return folder.FullName;
            }
        }

        throw new DirectoryNotFoundException($"No folder above {AppContext.BaseDirectory} holds Agents.sln: run the tests inside a clone.");
    }
}
