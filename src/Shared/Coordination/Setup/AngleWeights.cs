using Halfvoice.Grid;

namespace Halfvoice.Coordination;

/// <summary>
/// The automatic penalty of scheme angle, from public data only. A copy that tie lines of total susceptance b (MW/rad) touch
/// gets the weight w = 3 · (L / R̄) · b̄ · b  ($/rad²h), R̄ the mean range of the adjustable buses (MW) and b̄ the mean b of all
/// copies: on average an angle difference then costs three times what the flow that it stands for would cost under the rule
/// of scheme injection. Proportional to b rather than b², because that settled in about half the rounds on the networks
/// tried; the factor three is flat between 1 and 10.
/// </summary>
public sealed class AngleWeights
{
    private const double AverageFactor = 3;

    private readonly Network _network;
    private readonly double _weightPerMwPerRad;

    public AngleWeights(Network network, double priceScalePerMwh, double factor)
    {
        _network = network;
        var ranges = Enumerable.Range(0, network.Buses.Count)
            .Select(bus => network.GeneratorsAt(bus).Sum(g => network.Generators[g].RangeMw))
            .Where(range => range > PriceScale.TinyMw)
            .ToArray();
        var perMw2h = priceScalePerMwh / (ranges.Length > 0 ? ranges.Average() : 1);
        var touched = network.Sites.SelectMany(site => Touched(SiteCorner.Of(network, site))).Where(b => b > 0).DefaultIfEmpty(1).Average();
        _weightPerMwPerRad = AverageFactor * factor * perMw2h * touched;
    }

    /// <summary>The copies of a site: its own border buses in plan order, then the foreign buses that it touches.</summary>
    public IReadOnlyList<SiteCopy> CopiesOf(SiteCorner corner)
    {
        var touched = Touched(corner);
        return Enumerable.Range(0, corner.Nodes.Count)
            .Where(node => touched[node] > 0)
            .Select(node => new SiteCopy(_network.Buses[corner.Nodes[node]].Name, node, _weightPerMwPerRad * touched[node], touched[node]))
            .ToArray();
    }

    /// <summary>Total |susceptance| of the tie lines that touch each local node, MW/rad.</summary>
    private static double[] Touched(SiteCorner corner)
    {
        var touched = new double[corner.Nodes.Count];
        foreach (var line in corner.Lines)
        {
            if (line.FromNode < corner.OwnCount && line.ToNode < corner.OwnCount)
                continue;
            touched[line.FromNode] += Math.Abs(line.SusceptanceMwPerRad);
            touched[line.ToNode] += Math.Abs(line.SusceptanceMwPerRad);
        }

        return touched;
    }
}
