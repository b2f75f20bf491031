using System.Collections.Concurrent;
using System.Diagnostics;
using Halfvoice.Rig.Binaries;

namespace Halfvoice.Tests.Infrastructure;

public sealed class AgentBinariesTests : IDisposable
{
    private readonly TestFolder _folder = new();
    private readonly ConcurrentQueue<string> _progress = [];

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Theory]
    [InlineData("", "")]
    [InlineData("agent", "coordinator")]
    public async Task A_folder_that_was_asked_for_is_taken_flat_or_with_a_folder_each(string agentFolder, string coordinatorFolder)
    {
        var agent = Touch(agentFolder, "halfvoice-agent");
        var coordinator = Touch(coordinatorFolder, "halfvoice-coordinator");

        var binaries = await LocateAsync(new BinaryOptions { Folder = _folder.Path });

        Assert.Equal((agent, coordinator, BinaryKind.Native), (binaries.AgentPath, binaries.CoordinatorPath, binaries.Kind));
        Assert.Empty(binaries.Environment);
        Assert.Contains(_folder.Path, binaries.Description);
    }

    [Fact]
    public async Task A_build_that_needs_a_runtime_is_told_from_a_native_one_and_gets_tiered_compilation_off()
    {
        Touch("agent", "halfvoice-agent");
        Touch("coordinator", "halfvoice-coordinator");
        Touch("coordinator", "halfvoice-coordinator.dll", isExecutable: false);

        var binaries = await LocateAsync(new BinaryOptions { Folder = _folder.Path });

        Assert.Equal(BinaryKind.Jit, binaries.Kind);
        Assert.Equal("0", binaries.Environment["DOTNET_TieredCompilation"]);
        Assert.Contains("JIT", binaries.Description);
    }

    [Fact]
    public async Task A_folder_without_both_is_refused_by_name()
    {
        Touch("", "halfvoice-agent");

        var failure = await Assert.ThrowsAsync<BinariesException>(() => LocateAsync(new BinaryOptions { Folder = _folder.Path }));

        Assert.Contains(_folder.Path, failure.Message);
        Assert.Contains("halfvoice-coordinator", failure.Message);
    }

    [Fact]
    public async Task Agents_beside_the_rig_are_taken_before_anything_is_built()
    {
        var agent = Touch("agents", "halfvoice-agent");
        Touch("agents", "halfvoice-coordinator");

        var binaries = await LocateAsync(new BinaryOptions { RigFolder = _folder.Path });

        Assert.Equal(agent, binaries.AgentPath);
        Assert.Empty(_progress);
    }

    [Fact]
    public async Task Without_agents_and_without_source_the_message_says_what_to_give()
    {
        var failure = await Assert.ThrowsAsync<BinariesException>(() => LocateAsync(new BinaryOptions { RigFolder = _folder.Path }));

        Assert.Contains("--binaries", failure.Message);
    }

    [Fact]
    public async Task Source_is_built_ahead_of_time_once_however_many_ask_and_again_when_it_changed()
    {
        var options = new BinaryOptions();
        Assert.SkipUnless(
            !OperatingSystem.IsWindows() && options.SearchPath.Split(Path.PathSeparator)
                .Any(folder => File.Exists(Path.Combine(folder, "gcc")) || File.Exists(Path.Combine(folder, "clang"))),
            "There is no C toolchain here.");
        using var checkout = new SmallCheckout();
        options = options with { RigFolder = checkout.RigFolder };

        var both = await Task.WhenAll(LocateAsync(options), LocateAsync(options));

        Assert.All(both, binaries => Assert.Equal(BinaryKind.Native, binaries.Kind));
        Assert.Equal(1, Count("Building agent ahead of time ..."));
        Assert.Equal(1, Count("Building coordinator ahead of time ..."));
        Assert.Equal(1, Count("Another process is building the agents; waiting for it."));
        Assert.Equal(("the agent", "the coordinator"), (await SaysAsync(both[0].AgentPath), await SaysAsync(both[0].CoordinatorPath)));

        checkout.Write("Agent", "halfvoice-agent", "the newer agent");
        var again = await LocateAsync(options);

        Assert.Equal(2, Count("Building agent ahead of time ..."));
        Assert.Equal("the newer agent", await SaysAsync(again.AgentPath));
    }

    [Fact]
    public async Task A_failing_compiler_leads_to_the_JIT_build_and_is_told()
    {
        Assert.SkipWhen(OperatingSystem.IsWindows(), "The broken compiler is a shell script.");
        using var checkout = new SmallCheckout();
        var options = new BinaryOptions { RigFolder = checkout.RigFolder };
        options = options with { SearchPath = checkout.BrokenCompiler() + Path.PathSeparator + options.SearchPath };

        var binaries = await LocateAsync(options);

        Assert.Equal(BinaryKind.Jit, binaries.Kind);
        Assert.StartsWith("The ahead-of-time build failed: ", binaries.Reason);
        Assert.Contains("Agent.build.log", binaries.Reason);
        Assert.Equal("the coordinator", await SaysAsync(binaries.CoordinatorPath, binaries.Environment));

        // Without any compiler nothing is tried, and the JIT build that is there already serves.
        var dotnetFolder = Path.GetDirectoryName(Environment.GetEnvironmentVariable("DOTNET_HOST_PATH"))
            ?? options.SearchPath.Split(Path.PathSeparator).First(folder => File.Exists(Path.Combine(folder, "dotnet")));
        var bare = Directory.CreateDirectory(_folder.File("bare")).FullName;
        File.CreateSymbolicLink(Path.Combine(bare, "dotnet"), Path.Combine(dotnetFolder, "dotnet"));
        _progress.Clear();
        binaries = await LocateAsync(options with { SearchPath = bare });

        Assert.Equal(BinaryKind.Jit, binaries.Kind);
        Assert.Contains("install clang or gcc", binaries.Description);
        Assert.Empty(_progress);
    }

    [Fact]
    public async Task Source_that_does_not_compile_is_told_with_its_first_error()
    {
        using var checkout = new SmallCheckout();
        await File.WriteAllTextAsync(checkout.At("src", "Coordinator", "Program.cs"), "this is no program", Cancel);

        var failure = await Assert.ThrowsAsync<BinariesException>(
            () => LocateAsync(new BinaryOptions { RigFolder = checkout.RigFolder, JitOnly = true }));

        Assert.Contains("error CS", failure.Message);
        Assert.Contains("Coordinator.build.log", failure.Message);
    }

    [Fact]
    public async Task A_cancelled_build_ends_at_once_and_the_next_one_starts_afresh()
    {
        using var checkout = new SmallCheckout();
        var options = new BinaryOptions { RigFolder = checkout.RigFolder, JitOnly = true };
        using var stop = CancellationTokenSource.CreateLinkedTokenSource(Cancel);

        await Assert.ThrowsAnyAsync<OperationCanceledException>(() => AgentBinaries.LocateAsync(options, _ => stop.Cancel(), stop.Token));

        var binaries = await LocateAsync(options);
        Assert.Equal("It was asked for.", binaries.Reason);
        Assert.Equal("the agent", await SaysAsync(binaries.AgentPath, binaries.Environment));
    }

    public void Dispose() => _folder.Dispose();

    private int Count(string line) => _progress.Count(said => said == line);

    private Task<AgentBinaries> LocateAsync(BinaryOptions options) => AgentBinaries.LocateAsync(options, _progress.Enqueue, Cancel);

    private string Touch(string folder, string name, bool isExecutable = true)
    {
        var fileName = isExecutable && OperatingSystem.IsWindows() ? name + ".exe" : name;
        var path = Path.Combine(Directory.CreateDirectory(Path.Combine(_folder.Path, folder)).FullName, fileName);
        File.WriteAllText(path, "");
        return path;
    }

    private static async Task<string> SaysAsync(string executable, IReadOnlyDictionary<string, string?>? environment = null)
    {
        var info = new ProcessStartInfo(executable) { RedirectStandardOutput = true };
        foreach (var (name, value) in environment ?? new Dictionary<string, string?>())
            info.Environment[name] = value;
        using var process = Process.Start(info)!;
        var said = await process.StandardOutput.ReadToEndAsync(Cancel);
        await process.WaitForExitAsync(Cancel);
        Assert.Equal(0, process.ExitCode);
        return said.Trim();
    }
}
