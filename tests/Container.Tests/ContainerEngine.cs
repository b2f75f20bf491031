using DotNet.Testcontainers.Configurations;

[assembly: AssemblyFixture(typeof(Halfvoice.Containers.ContainerEngine))]

namespace Halfvoice.Containers;

/// <summary>
/// Decides once for all tests whether this machine can run containers, and builds the images that they test from the
/// sources as they are now.
/// </summary>
public sealed class ContainerEngine : IAsyncLifetime
{
    /// <summary>Set to 1 (the continuous integration does) where a missing engine is a failure and no reason to skip.</summary>
    public const string RequireVariable = "HALFVOICE_REQUIRE_CONTAINERS";

    private static readonly TimeSpan BuildTimeout = TimeSpan.FromMinutes(10);

    private string? _unavailableBecause;

    /// <summary>Skips the calling test with the reason where no containers can be had, or fails it where they must be.</summary>
    public void RequireImages()
    {
        if (_unavailableBecause is null)
        {
            return;
        }

        if (Environment.GetEnvironmentVariable(RequireVariable) == "1")
        {
            Assert.Fail($"{RequireVariable}=1, but {_unavailableBecause}");
        }

        Assert.Skip(_unavailableBecause);
    }

    /// <inheritdoc/>
    public async ValueTask InitializeAsync()
    {
        using var timeout = new CancellationTokenSource(BuildTimeout);
        var engine = await ChildCommand.RunAsync("docker", ["version", "--format", "{{.Server.APIVersion}}"], timeout.Token);
        if (engine.ExitCode != 0)
        {
            _unavailableBecause = $"no container engine answers: {engine.Tail}";
            return;
        }

        // The client library assumes a newer interface than older engines speak, so it is told what this one speaks.
        SetWhereUnset("DOCKER_API_VERSION", engine.Output.Trim());

        // The library cleans up by an image of a public registry, which an air-gapped lab does not reach.
        // Every test disposes of its own containers instead.
        TestcontainersSettings.ResourceReaperEnabled = false;

        var images = await ChildCommand.RunAsync("bash", [Repository.PathOf("deploy", "images.sh")], timeout.Token);
        if (images.ExitCode != 0)
        {
            _unavailableBecause = $"deploy/images.sh could not build the images (exit code {images.ExitCode}): {images.Tail}";
        }
    }

    /// <inheritdoc/>
    public ValueTask DisposeAsync() => ValueTask.CompletedTask;

    private static void SetWhereUnset(string variable, string value)
    {
        if (string.IsNullOrEmpty(Environment.GetEnvironmentVariable(variable)))
        {
            Environment.SetEnvironmentVariable(variable, value);
        }
    }
}
