namespace Halfvoice.Plans;

/// <summary>
/// A plan folder as Shared sees it: names and bytes, wherever they are kept. Implementations never throw for what a
/// user can cause (no such folder, no permission, too large); they say what is wrong instead.
/// </summary>
public interface IPlanFiles
{
    /// <summary>All files of the folder and of its folders <c>grid</c> and <c>loads</c>, with forward slashes, in any order.</summary>
    PlanFileNames List();

    /// <summary>A file's bytes, at most <paramref name="maxBytes"/> of them; a longer file is a problem, not a part of it.</summary>
    PlanFileContent Read(string name, int maxBytes);
}

/// <summary>The answer of <see cref="IPlanFiles.List"/>.</summary>
/// <param name="Names">Relative names such as <c>grid/buses.csv</c>.</param>
/// <param name="Problem">What kept the folder from being listed; null if nothing did.</param>
public readonly record struct PlanFileNames(IReadOnlyList<string> Names, string? Problem = null);

/// <summary>The answer of <see cref="IPlanFiles.Read"/>: bytes, or what kept them from being read.</summary>
public readonly record struct PlanFileContent(byte[]? Bytes, string? Problem = null);
