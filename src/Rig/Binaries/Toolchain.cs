using System.Runtime.InteropServices;

namespace Halfvoice.Rig.Binaries;

/// <summary>What this machine can compile ahead of time with.</summary>
public static class Toolchain
{
    private static readonly string[] _supported =
        ["linux-x64", "linux-arm64", "linux-musl-x64", "linux-musl-arm64", "osx-x64", "osx-arm64"];

    /// <summary>
    /// The portable runtime identifier of this machine. The runtime's own may name a distribution, and there are no compilers
    /// published for those.
    /// </summary>
    public static string RuntimeIdentifier
    {
        get
        {
            var own = RuntimeInformation.RuntimeIdentifier;
            var isMusl = own.Contains("musl", StringComparison.Ordinal) || own.StartsWith("alpine", StringComparison.Ordinal);
            var system = OperatingSystem.IsWindows() ? "win" : OperatingSystem.IsMacOS() ? "osx" : isMusl ? "linux-musl" : "linux";
            return $"{system}-{RuntimeInformation.ProcessArchitecture.ToString().ToLowerInvariant()}";
        }
    }

    /// <summary>Why no ahead-of-time build can be made here; null when one can.</summary>
    /// <param name="searchPath">Folders to look for a C compiler in, as in PATH.</param>
    public static string? WhyNotNative(string searchPath)
    {
        if (!_supported.Contains(RuntimeIdentifier))
            return $"Ahead-of-time builds are not made for {RuntimeIdentifier}.";
        return FindCommand("clang", searchPath) is null && FindCommand("gcc", searchPath) is null
            ? "No C toolchain was found: install clang or gcc for agents that start faster and need less memory."
            : null;
    }

    /// <summary>Full path of a command, or null.</summary>
    public static string? FindCommand(string name, string searchPath) =>
        searchPath.Split(Path.PathSeparator, StringSplitOptions.RemoveEmptyEntries)
            .Select(folder => Path.Combine(folder, AgentBinaries.FileNameOf(name)))
            .FirstOrDefault(File.Exists);
}
