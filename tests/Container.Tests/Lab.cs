using System.Globalization;
using System.Text;
using DotNet.Testcontainers.Builders;
using DotNet.Testcontainers.Configurations;
using DotNet.Testcontainers.Containers;
using DotNet.Testcontainers.Networks;

namespace Halfvoice.Containers;

/// <summary>A coordinator and one agent a site, each in a container, on a network of their own without a way out.</summary>
internal sealed class Lab : IAsyncDisposable
{
    public const string CoordinatorName = "coordinator";
    public const int CoordinatorPort = 7443;

    private readonly INetwork _network;
    private readonly IContainer _coordinator;
    private readonly IReadOnlyList<(string Site, IContainer Container)> _agents;

    private Lab(LabBundles bundles)
    {
        _network = new NetworkBuilder().WithCreateParameterModifier(network => network.Internal = true).Build();
        _coordinator = Member(Lockdown.CoordinatorImage, CoordinatorName, bundles.Coordinator, bundles.Owner)
            .WithWaitStrategy(Wait.ForUnixContainer().UntilMessageIsLogged("\"event\":\"ready\""))
            .Build();
        _agents =
        [
            .. bundles.Sites.Select(site => (site.Site, Member(Lockdown.AgentImage, site.Site, site.Folder, bundles.Owner).Build())),
        ];
    }

    /// <summary>Starts the network, the coordinator, and once that listens all agents.</summary>
    public static async Task<Lab> StartAsync(LabBundles bundles, CancellationToken cancellation)
    {
        var lab = new Lab(bundles);
        try
        {
            await lab._network.CreateAsync(cancellation);
            await lab._coordinator.StartAsync(cancellation);
            await Task.WhenAll(lab._agents.Select(agent => agent.Container.StartAsync(cancellation)));
            return lab;
        }
        catch
        {
            await lab.DisposeAsync();
            throw;
        }
    }

    /// <summary>Waits until every container has ended by itself.</summary>
    /// <returns>The exit code of each, by name.</returns>
    /// <exception cref="TimeoutException">The time was up first; the message holds everyone's last lines.</exception>
    public async Task<IReadOnlyDictionary<string, long>> ExitCodesAsync(CancellationToken cancellation)
    {
        try
        {
            var exits = new Dictionary<string, long> { [CoordinatorName] = await _coordinator.GetExitCodeAsync(cancellation) };
            foreach (var (site, container) in _agents)
            {
                exits[site] = await container.GetExitCodeAsync(cancellation);
            }

            return exits;
        }
        catch (OperationCanceledException timeIsUp)
        {
            throw new TimeoutException($"Not every container ended in time. {await LastLinesAsync()}", timeIsUp);
        }
    }

    /// <summary>All that the coordinator wrote to its standard output so far.</summary>
    public async Task<string> CoordinatorOutputAsync(CancellationToken cancellation) =>
        (await _coordinator.GetLogsAsync(timestampsEnabled: false, ct: cancellation)).Stdout;

    /// <summary>The last lines of every container, for the message of a failed test.</summary>
    public async Task<string> LastLinesAsync()
    {
        var report = new StringBuilder();
        foreach (var (name, container) in _agents.Prepend((CoordinatorName, _coordinator)))
        {
            var (output, errors) = await container.GetLogsAsync(timestampsEnabled: false);
            var lines = (output + errors).TrimEnd().Split('\n').TakeLast(10);
            report.AppendLine(CultureInfo.InvariantCulture, $"{name}:").AppendJoin('\n', lines).AppendLine();
        }

        return report.ToString();
    }

    /// <inheritdoc/>
    public async ValueTask DisposeAsync()
    {
        await Task.WhenAll(_agents.Select(agent => agent.Container.DisposeAsync().AsTask()));
        await _coordinator.DisposeAsync();
        await _network.DisposeAsync();
    }

    private ContainerBuilder Member(string image, string name, string bundle, string user) =>
        Lockdown.Container(image, user)
            .WithNetwork(_network)
            .WithNetworkAliases(name)
            .WithBindMount(bundle, "/bundle", AccessMode.ReadOnly);
}
