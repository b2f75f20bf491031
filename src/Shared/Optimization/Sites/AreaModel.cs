using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>
/// What a site of one or more buses knows of its part of the network. Local nodes 0 … own − 1 are its own buses; the
/// nodes from there on are foreign buses that its tie lines touch. Angles held in common with others are copies: every
/// foreign node, and the own buses that others touch.
/// </summary>
/// <param name="OwnBusCount">Own buses, at least 1.</param>
/// <param name="Generators">Generators with <see cref="Generator.Bus"/> as local index of an own bus.</param>
/// <param name="Lines">Inner lines and tie lines.</param>
/// <param name="CopyNodes">Local nodes that are copies, each once, in the order of anchors and answers.</param>
/// <param name="CopyWeights">w_c, $/rad²h, more than 0, one per copy.</param>
/// <param name="UnservedPricePerMwh">V, $/MWh, positive and finite: the price of shed load and of spilt power.</param>
public sealed record AreaModel(
    int OwnBusCount,
    IReadOnlyList<Generator> Generators,
    IReadOnlyList<AreaLine> Lines,
    IReadOnlyList<int> CopyNodes,
    IReadOnlyList<double> CopyWeights,
    double UnservedPricePerMwh)
{
    /// <summary>Own and foreign nodes.</summary>
    public int NodeCount => Math.Max(
        OwnBusCount, 1 + Lines.Select(line => Math.Max(line.From, line.To)).Concat(CopyNodes).DefaultIfEmpty(-1).Max());

    /// <summary>Refuses a model that breaks the rules above.</summary>
    /// <exception cref="ArgumentException">Says which rule.</exception>
    public void Validate()
    {
        if (OwnBusCount < 1)
            throw new ArgumentException("A site needs at least one bus.");
        if (!(UnservedPricePerMwh > 0) || !double.IsFinite(UnservedPricePerMwh))
            throw new ArgumentException("The price of unserved load must be positive and finite.");
        _ = new SupplyCurve(Generators);
        foreach (var generator in Generators.Where(generator => generator.Bus < 0 || generator.Bus >= OwnBusCount))
            throw new ArgumentException($"Generator {generator.Name} does not stand at an own bus of the site.");
        foreach (var line in Lines)
            ValidateLine(line);
        if (CopyWeights.Count != CopyNodes.Count)
            throw new ArgumentException($"There are {CopyNodes.Count} copies but {CopyWeights.Count} weights.");
        if (CopyWeights.Any(weight => !(weight > 0) || !double.IsFinite(weight)))
            throw new ArgumentException("Every copy needs a positive, finite weight.");
        if (CopyNodes.Any(node => node < 0) || CopyNodes.Distinct().Count() != CopyNodes.Count)
            throw new ArgumentException("Every copy must name a different local node.");
        for (var node = OwnBusCount; node < NodeCount; node++)
        {
            if (!CopyNodes.Contains(node))
                throw new ArgumentException($"Foreign node {node} is touched by a line but is no copy.");
        }
    }

    private void ValidateLine(AreaLine line)
    {
        if (line.From < 0 || line.To < 0 || line.From == line.To || Math.Min(line.From, line.To) >= OwnBusCount)
            throw new ArgumentException("A line must join two different nodes, one of them an own bus.");
        if (!double.IsFinite(line.SusceptanceMwPerRad) || line.SusceptanceMwPerRad == 0)
            throw new ArgumentException("A line needs a finite susceptance other than 0.");
        if (!(line.LimitMw >= 0))
            throw new ArgumentException("A line's limit must be 0 MW or more, or positive infinity.");
    }
}
