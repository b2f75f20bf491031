using DotNet.Testcontainers.Builders;

namespace Halfvoice.Containers;

public sealed class ImageTests(ContainerEngine engine)
{
    private const string Loader = "/lib64/ld-linux-x86-64.so.2";

    [Theory]
    [InlineData(Lockdown.AgentImage, "/opt/halfvoice/halfvoice-agent")]
    [InlineData(Lockdown.CoordinatorImage, "/opt/halfvoice/halfvoice-coordinator")]
    public async Task A_binary_runs_in_its_image_as_an_unprivileged_user_with_a_read_only_root(string image, string binary)
    {
        engine.RequireImages();
        var (exitCode, said) = await RunAsync(Lockdown.Container(image).WithEntrypoint(binary).WithCommand("--version"));
        Assert.True(exitCode == 0, $"exit code {exitCode}: {said}");
    }

    /// <summary>
    /// The encryption library is opened at run time, so a missing one would show at the first connection only; the loader
    /// is asked for it, and for the database library beside the binary, by name.
    /// </summary>
    [Theory]
    [InlineData(Lockdown.AgentImage, "/opt/halfvoice/halfvoice-agent")]
    [InlineData(Lockdown.AgentImage, "/opt/halfvoice/libe_sqlite3.so")]
    [InlineData(Lockdown.AgentImage, "libssl.so.3")]
    [InlineData(Lockdown.CoordinatorImage, "/opt/halfvoice/halfvoice-coordinator")]
    [InlineData(Lockdown.CoordinatorImage, "/opt/halfvoice/libe_sqlite3.so")]
    [InlineData(Lockdown.CoordinatorImage, "libssl.so.3")]
    public async Task Every_library_that_a_binary_needs_is_in_its_image(string image, string file)
    {
        engine.RequireImages();
        var (exitCode, said) = await RunAsync(Lockdown.Container(image).WithEntrypoint(Loader).WithCommand("--list", file));
        Assert.True(exitCode == 0, $"exit code {exitCode}: {said}");
        Assert.Contains("libc.so.6 => ", said, StringComparison.Ordinal);
        Assert.DoesNotContain("not found", said, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData(Lockdown.AgentImage)]
    [InlineData(Lockdown.CoordinatorImage)]
    public async Task An_image_runs_as_a_user_other_than_root(string image)
    {
        engine.RequireImages();
        var definition = Lockdown.Container(image)
            .WithCreateParameterModifier(parameters => parameters.User = string.Empty)
            .WithEntrypoint("/bin/cat").WithCommand("/proc/self/status");
        var (exitCode, said) = await RunAsync(definition);
        Assert.True(exitCode == 0, $"exit code {exitCode}: {said}");
        Assert.Contains("Uid:\t10001\t10001\t10001\t10001", said, StringComparison.Ordinal);
        Assert.Contains("CapEff:\t0000000000000000", said, StringComparison.Ordinal);
        Assert.Contains("NoNewPrivs:\t1", said, StringComparison.Ordinal);
    }

    private static async Task<(long ExitCode, string Said)> RunAsync(ContainerBuilder definition)
    {
        var cancellation = TestContext.Current.CancellationToken;
        await using var container = definition.Build();
        await container.StartAsync(cancellation);
        var exitCode = await container.GetExitCodeAsync(cancellation);
        var (output, errors) = await container.GetLogsAsync(timestampsEnabled: false, ct: cancellation);
        return (exitCode, output + errors);
    }
}
