namespace Halfvoice.Tests.Conventions;

/// <summary>The files under src/ and tests/ that people write: no build output, paths relative to the top with forward slashes.</summary>
internal static class SourceTree
{
    private static readonly string[] Top = ["src", "tests"];
    private static readonly string[] Built = ["bin", "obj", "artifacts", "TestResults"];

    /// <summary>Every file that ends in one of the extensions; the calling test is skipped outside a source tree.</summary>
    /// <param name="extensions">With the dot, such as <c>.cs</c>.</param>
    public static IReadOnlyList<SourceFile> Files(params string[] extensions)
    {
        var root = Repository.Root;
        var files = Top.Select(name => new DirectoryInfo(Path.Combine(root, name))).SelectMany(Below)
            .Where(file => extensions.Contains(file.Extension, StringComparer.Ordinal))
            .Select(file => new SourceFile(Path.GetRelativePath(root, file.FullName).Replace('\\', '/'), File.ReadAllText(file.FullName)))
            .ToArray();
        Assert.NotEmpty(files);
        return files;
    }

    private static IEnumerable<FileInfo> Below(DirectoryInfo folder) => folder.EnumerateFiles()
        .Concat(folder.EnumerateDirectories().Where(sub => !Built.Contains(sub.Name, StringComparer.Ordinal)).SelectMany(Below));
}
