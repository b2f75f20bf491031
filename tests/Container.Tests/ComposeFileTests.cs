using System.Text.RegularExpressions;

namespace Halfvoice.Containers;

/// <summary>docker-compose.yml writes the demo's sites out, so something has to keep the two in step.</summary>
public sealed partial class ComposeFileTests
{
    [Fact]
    public void The_compose_file_runs_one_agent_for_each_site_of_the_demo_plan()
    {
        var buses = File.ReadAllLines(Repository.PathOf("deploy", "plans", "sallow-reach", "grid", "buses.csv"));
        Assert.StartsWith("bus,site", buses[0], StringComparison.Ordinal);
        var sites = buses.Skip(1).Where(line => line.Length > 0).Select(line => line.Split(',')[1])
            .Distinct().Order(StringComparer.Ordinal);

        var agents = AgentService().Matches(File.ReadAllText(Repository.PathOf("docker-compose.yml")));

        Assert.Equal(sites, agents.Select(m => m.Groups["service"].Value).Order(StringComparer.Ordinal));
        Assert.All(agents, m => Assert.Equal(m.Groups["service"].Value, m.Groups["bundle"].Value));
        Assert.All(agents, m => Assert.Equal(m.Groups["service"].Value, m.Groups["state"].Value));
    }

    [GeneratedRegex(
        @"^  (?<service>[a-z0-9-]+):\n    <<: \*agent\n    volumes:\n" +
        @".*source: \./deploy/lab/sites/(?<bundle>[a-z0-9-]+), .*\n.*source: (?<state>[a-z0-9-]+), ",
        RegexOptions.Multiline)]
    private static partial Regex AgentService();
}
