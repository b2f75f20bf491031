using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

/// <summary>Finds and loads plan folders for tests.</summary>
internal static class PlanFolders
{
    /// <summary>The folder that holds the solution.</summary>
    public static string Repository => Support.Repository.Root;

    public static string Demo => Support.Repository.PathOf("deploy", "plans", "sallow-reach");

    public static string Sample => Support.Repository.PathOf("deploy", "plans", "three-fords");

    /// <summary>A path in the folder of published cases beside the project; the test is skipped where it is absent.</summary>
    public static string Case(params string[] parts) => Support.Repository.Case(parts);

    public static Dictionary<string, byte[]> Bytes(string folder) => Directory
        .EnumerateFiles(folder, "*", SearchOption.AllDirectories)
        .ToDictionary(path => Path.GetRelativePath(folder, path).Replace('\\', '/'), File.ReadAllBytes);

    public static PlanReading Read(string folder) => PlanReader.Read(new MemoryPlanFiles(Bytes(folder)));
}
