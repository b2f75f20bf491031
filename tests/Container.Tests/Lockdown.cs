using Docker.DotNet.Models;
using DotNet.Testcontainers.Builders;
using DotNet.Testcontainers.Images;

namespace Halfvoice.Containers;

/// <summary>
/// The restrictions of docker-compose.yml, so that the tests see what an operator runs: read-only root file system, no
/// capabilities, no way to gain any.
/// </summary>
internal static class Lockdown
{
    public const string AgentImage = "halfvoice-agent:local";
    public const string CoordinatorImage = "halfvoice-coordinator:local";

    /// <summary>A container of a local image (never pulled) under all restrictions, with an empty /state.</summary>
    /// <param name="image">One of the images above.</param>
    /// <param name="user">"uid:gid", or null for the user that the image names.</param>
    public static ContainerBuilder Container(string image, string? user = null) =>
        new ContainerBuilder(image)
            .WithImagePullPolicy(PullPolicy.Never)
            .WithTmpfsMount("/state")
            .WithCreateParameterModifier(parameters =>
            {
                parameters.User = user ?? parameters.User;
                parameters.HostConfig ??= new HostConfig();
                parameters.HostConfig.ReadonlyRootfs = true;
                parameters.HostConfig.CapDrop = ["ALL"];
                parameters.HostConfig.SecurityOpt = ["no-new-privileges"];
            });
}
