namespace Halfvoice.Support;

/// <summary>Finds files of the repository from a test that runs somewhere below it.</summary>
internal static class Repository
{
    private static readonly string? Found = FindRoot();

    /// <summary>The folder that holds Agents.sln; the calling test is skipped where the tests run outside a clone.</summary>
    public static string Root
    {
        get
        {
            Assert.SkipWhen(Found is null, "The source tree is not at hand: no folder above the tests holds Agents.sln.");
            return Found!;
        }
    }

    /// <summary>The absolute path of a file or folder that is named relative to the top level.</summary>
    public static string PathOf(params string[] parts) => Path.Combine([Root, .. parts]);

    /// <summary>A path in the folder of published cases beside the repository; the calling test is skipped where it is absent.</summary>
    public static string Case(params string[] parts)
    {
        var cases = PathOf("..", "shared", "cases");
        Assert.SkipUnless(Directory.Exists(cases), "The folder shared/cases with the published networks is not beside the repository.");
        return Path.Combine([cases, .. parts]);
    }

    private static string? FindRoot()
    {
        var folder = new DirectoryInfo(AppContext.BaseDirectory);
        while (folder is not null && !File.Exists(Path.Combine(folder.FullName, "Agents.sln")))
            folder = folder.Parent;
        return folder?.FullName;
    }
}
