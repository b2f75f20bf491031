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

    /// <summary>The user and the group that the Dockerfiles name.</summary>
    public const string UserOfTheImages = "10001:10001";

    /// <summary>A container of a local image (never pulled) under all restrictions, with an empty /state.</summary>
    /// <param name="image">One of the images above.</param>
    /// <param name="user">Who runs it and owns its /state: "uid:gid".</param>
    public static ContainerBuilder Container(string image, string user = UserOfTheImages) =>
        new ContainerBuilder(image)
            .WithImagePullPolicy(PullPolicy.Never)
            .WithCreateParameterModifier(parameters =>
            {
                parameters.User = user;
                parameters.HostConfig ??= new HostConfig();
                parameters.HostConfig.Tmpfs = new Dictionary<string, string> { ["/state"] = OwnedBy(user) };
                parameters.HostConfig.ReadonlyRootfs = true;
                parameters.HostConfig.CapDrop = ["ALL"];
                parameters.HostConfig.SecurityOpt = ["no-new-privileges"];
            });

    /// <summary>Mount options of a folder in memory that one user alone may enter.</summary>
    private static string OwnedBy(string user)
    {
        return user.Split(':') is [var uid, var gid]
            ? $"uid={uid},gid={gid},mode=0700"
            : throw new ArgumentException("Not of the form uid:gid.", nameof(user));
    }
}
