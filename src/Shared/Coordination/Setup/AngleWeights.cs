using Halfvoice.Grid;

namespace Halfvoice.Coordination;

/// <summary>
/// The automatic penalty of scheme angle. A copy that tie lines of total susceptance b (MW/rad) touch gets the weight
/// w = (L / R̄) · b²  ($/rad²h), R̄ the mean range of the adjustable buses (MW): an angle difference then costs what the
/// flow that it stands for would cost under the rule of scheme injection.
/// </summary>
public sealed class AngleWeights
{
    private readonly Network _network;
    private readonly double _perMw2h;

    public AngleWeights(Network network, double priceScalePerMwh, double factor)
    {
        _network = network;
        var ranges = Enumerable.Range(0, network.Buses.Count)
            .Select(bus => network.GeneratorsAt(bus).Sum(g => network.Generators[g].RangeMw))
            .Where(range => range > PriceScale.TinyMw)
            .ToArray();
        _perMw2h = factor * priceScalePerMwh / (ranges.Length > 0 ? ranges.Average() : 1);
    }

    /// <summary>The copies of a site: its own border buses in plan order, then the foreign buses that it touches.</summary>
    public IReadOnlyList<SiteCopy> CopiesOf(SiteCorner corner)
    {
        var touched = new double[corner.Nodes.Count];
        foreach (var line in corner.Lines)
        {
            if (line.FromNode < corner.OwnCount && line.ToNode < corner.OwnCount)
                continue;
            touched[line.FromNode] += Math.Abs(line.SusceptanceMwPerRad);
            touched[line.ToNode] += Math.Abs(line.SusceptanceMwPerRad);
        }

        return Enumerable.Range(0, corner.Nodes.Count)
            .Where(node => touched[node] > 0)
            .Select(node => new SiteCopy(_network.Buses[corner.Nodes[node]].Name, node, _perMw2h * touched[node] * touched[node], touched[node]))
            .ToArray();
    }
}
