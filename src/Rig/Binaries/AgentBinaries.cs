using System.Runtime.InteropServices;

namespace Halfvoice.Rig.Binaries;

/// <summary>The executables of a rehearsal.</summary>
public sealed record AgentBinaries
{
    /// <summary>File name of the agent's executable, without the ending that some systems want.</summary>
    public const string AgentName = "halfvoice-agent";

    /// <summary>File name of the coordinator's executable, without the ending that some systems want.</summary>
    public const string CoordinatorName = "halfvoice-coordinator";

    /// <summary>Full path of the agent.</summary>
    public required string AgentPath { get; init; }

    /// <summary>Full path of the coordinator.</summary>
    public required string CoordinatorPath { get; init; }

    /// <summary>How they run; <see cref="BinaryKind.Jit"/> when either of them needs a runtime.</summary>
    public required BinaryKind Kind { get; init; }

    /// <summary>Why these: a sentence for the user.</summary>
    public required string Reason { get; init; }

    /// <summary>One line that says which build runs, and why.</summary>
    public string Description =>
        (Kind == BinaryKind.Native ? "Agents: Native AOT build. " : "Agents: JIT build, tiered compilation off. ") + Reason;

    /// <summary>
    /// Variables to start them with. A JIT build gets tiered compilation switched off and is pointed at the runtime that runs us,
    /// because its own search knows only the usual places.
    /// </summary>
    public IReadOnlyDictionary<string, string?> Environment { get; } = new Dictionary<string, string?>();

    /// <summary>
    /// Finds the executables or builds them: the folder that was asked for; the folder <c>agents</c> beside the rig; in a source
    /// checkout an ahead-of-time build where this machine can make one, otherwise a JIT build.
    /// </summary>
    /// <param name="options">Where to look.</param>
    /// <param name="progress">Takes lines that tell a waiting user what happens.</param>
    /// <param name="cancel">Gives up, and ends a build that runs.</param>
    /// <exception cref="BinariesException">Nothing was found, and nothing could be built.</exception>
    public static async Task<AgentBinaries> LocateAsync(BinaryOptions options, Action<string> progress, CancellationToken cancel = default)
    {
        ArgumentNullException.ThrowIfNull(options);
        ArgumentNullException.ThrowIfNull(progress);
        if (options.Folder is { } folder)
        {
            return InFolder(folder, $"They were asked for in '{folder}'.")
                ?? throw new BinariesException(
                    $"'{folder}' does not hold both {AgentName} and {CoordinatorName}, neither directly nor in its folders 'agent' and " +
                    "'coordinator'. Give the folder that holds them, or leave --binaries away.");
        }

        var beside = Path.Combine(options.RigFolder, "agents");
        if (InFolder(beside, "They came with the rig.") is { } shipped)
            return shipped;
        if (SourceCheckout.Find(options.RigFolder) is { } checkout)
            return await new AgentBuild(checkout, options, progress).RunAsync(cancel).ConfigureAwait(false);
        throw new BinariesException(
            $"There are no agents in '{beside}', and the rig does not run from a source checkout that they could be built from. " +
            $"Give the folder that holds {AgentName} and {CoordinatorName} with --binaries.");
    }

    /// <summary>The pair in a folder, or null when it is not complete.</summary>
    internal static AgentBinaries? InFolder(string folder, string reason)
    {
        var agent = FindExecutable(folder, "agent", AgentName);
        var coordinator = FindExecutable(folder, "coordinator", CoordinatorName);
        return agent is null || coordinator is null ? null : Of(agent, coordinator, reason);
    }

    /// <summary>Describes two executables that exist.</summary>
    internal static AgentBinaries Of(string agent, string coordinator, string reason)
    {
        // A JIT build's executable is a small host for the library of the same name beside it.
        var isJit = new[] { agent, coordinator }.Any(path => File.Exists(Path.ChangeExtension(path, null) + ".dll"));
        return new AgentBinaries(isJit ? JitEnvironment() : new Dictionary<string, string?>())
        {
            AgentPath = Path.GetFullPath(agent),
            CoordinatorPath = Path.GetFullPath(coordinator),
            Kind = isJit ? BinaryKind.Jit : BinaryKind.Native,
            Reason = reason,
        };
    }

    /// <summary>A file name as this system wants executables to be named.</summary>
    internal static string FileNameOf(string name) => OperatingSystem.IsWindows() ? name + ".exe" : name;

    private AgentBinaries(IReadOnlyDictionary<string, string?> environment) => Environment = environment;

    private static string? FindExecutable(string folder, string ownFolder, string name)
    {
        string[] places = [Path.Combine(folder, FileNameOf(name)), Path.Combine(folder, ownFolder, FileNameOf(name))];
        return places.FirstOrDefault(File.Exists);
    }

    private static Dictionary<string, string?> JitEnvironment()
    {
        var variables = new Dictionary<string, string?> { ["DOTNET_TieredCompilation"] = "0" };
        // .../shared/Microsoft.NETCore.App/10.0.x/ lies three folders below the root that holds host/fxr.
        var root = Path.GetFullPath(Path.Combine(RuntimeEnvironment.GetRuntimeDirectory(), "..", "..", ".."));
        if (Directory.Exists(Path.Combine(root, "host", "fxr")))
            variables["DOTNET_ROOT"] = root;
        return variables;
    }
}
