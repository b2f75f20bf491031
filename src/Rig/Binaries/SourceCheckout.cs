using System.Security.Cryptography;
using System.Text;

namespace Halfvoice.Rig.Binaries;

/// <summary>The folder with the solution and the source that agents are built from.</summary>
internal sealed class SourceCheckout
{
    private static readonly string[] _sourceEndings =
        [".cs", ".csproj", ".proto", ".props", ".targets", ".txt", ".json", ".html", ".css", ".js", ".svg"];

    private static readonly string[] _rootFiles =
        ["Directory.Build.props", "Directory.Build.targets", "Directory.Packages.props", "global.json"];

    private SourceCheckout(string folder) => Folder = folder;

    /// <summary>Full path of the folder that holds Agents.sln.</summary>
    public string Folder { get; }

    /// <summary>Where builds leave their results.</summary>
    public string Artifacts => Path.Combine(Folder, "artifacts");

    /// <summary>The checkout that a folder lies in, or null.</summary>
    public static SourceCheckout? Find(string from)
    {
        for (var folder = new DirectoryInfo(Path.GetFullPath(from)); folder is not null; folder = folder.Parent)
        {
            var isTop = File.Exists(Path.Combine(folder.FullName, "Agents.sln"));
            if (isTop && File.Exists(Path.Combine(folder.FullName, "src", "Agent", "Agent.csproj")))
                return new SourceCheckout(folder.FullName);
        }

        return null;
    }

    /// <summary>
    /// A hash over everything that goes into agent and coordinator: names and contents of all source under src but the rig's own,
    /// the settings at the top, and the version of the runtime that builds.
    /// </summary>
    public string Stamp()
    {
        using var hash = IncrementalHash.CreateHash(HashAlgorithmName.SHA256);
        hash.AppendData(Encoding.UTF8.GetBytes($"{Environment.Version}\n"));
        foreach (var path in Inputs().Order(StringComparer.Ordinal))
        {
            var content = File.ReadAllBytes(Path.Combine(Folder, path));
            hash.AppendData(Encoding.UTF8.GetBytes($"{path}\n{content.Length}\n"));
            hash.AppendData(content);
        }

        return Convert.ToHexStringLower(hash.GetHashAndReset());
    }

    private IEnumerable<string> Inputs()
    {
        var source = Path.Combine(Folder, "src");
        foreach (var path in Directory.EnumerateFiles(source, "*", SearchOption.AllDirectories))
        {
            var relative = Path.GetRelativePath(Folder, path);
            var folders = relative.Split(Path.DirectorySeparatorChar);
            var isInput = folders[1] != "Rig" && !folders.Contains("bin") && !folders.Contains("obj");
            if (isInput && _sourceEndings.Contains(Path.GetExtension(path)))
                yield return relative;
        }

        foreach (var name in _rootFiles.Where(name => File.Exists(Path.Combine(Folder, name))))
            yield return name;
    }
}
