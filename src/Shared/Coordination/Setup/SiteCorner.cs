using Halfvoice.Grid;

namespace Halfvoice.Coordination;

/// <summary>
/// A site's corner of the network in local numbering: own buses first (plan order), then the foreign buses that its lines
/// touch, in order of first appearance.
/// </summary>
public sealed class SiteCorner
{
    private SiteCorner(int ownCount, IReadOnlyList<int> nodes, IReadOnlyList<SiteLine> lines)
    {
        OwnCount = ownCount;
        Nodes = nodes;
        Lines = lines;
    }

    public int OwnCount { get; }

    /// <summary>Plan bus index of every local node.</summary>
    public IReadOnlyList<int> Nodes { get; }

    /// <summary>All lines that touch an own bus.</summary>
    public IReadOnlyList<SiteLine> Lines { get; }

    public static SiteCorner Of(Network network, string site)
    {
        var own = network.BusesOf(site);
        var nodes = own.ToList();
        var local = own.Select((bus, i) => (bus, i)).ToDictionary(pair => pair.bus, pair => pair.i);
        var lines = new List<SiteLine>();
        foreach (var index in own.SelectMany(network.LinesAt).Distinct().Order())
        {
            var line = network.Lines[index];
            lines.Add(new SiteLine(line.Name, Node(line.FromBus), Node(line.ToBus), network.SusceptanceMwPerRad(index),
                double.IsFinite(line.LimitMw) ? line.LimitMw : null));
        }

        return new SiteCorner(own.Count, nodes, lines);

        int Node(int bus)
        {
            if (!local.TryGetValue(bus, out var node))
            {
                node = nodes.Count;
                nodes.Add(bus);
                local.Add(bus, node);
            }

            return node;
        }
    }
}
