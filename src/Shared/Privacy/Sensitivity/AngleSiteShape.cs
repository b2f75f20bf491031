namespace Halfvoice.Privacy;

/// <summary>A line that touches a site, as far as its sensitivity depends on it.</summary>
/// <param name="From">Index of a node, see <see cref="AngleSiteShape"/>.</param>
/// <param name="To">Index of another node.</param>
/// <param name="SusceptanceMwPerRad">base_mva / reactance_pu, MW/rad; not 0, negative for a series capacitor.</param>
/// <param name="Limited">Whether the line has a flow limit.</param>
public sealed record AngleSiteLine(int From, int To, double SusceptanceMwPerRad, bool Limited);

/// <summary>
/// What the sensitivity of a site under scheme <c>angle</c> depends on; all of it public. Nodes 0 … OwnBuses − 1 are the
/// site's own buses, the nodes after them are the foreign buses that its lines reach. Costs, plant limits, the values of
/// flow limits and the ask do not matter: the bound holds for all of them.
/// </summary>
public sealed record AngleSiteShape
{
    /// <summary>Largest ratio of two weights, or of two susceptances: up to it the bounds' own rounding stays inside their allowance.</summary>
    public const double MaxRatio = 1e6;

    /// <param name="ownBuses">Own buses, at least 1.</param>
    /// <param name="copyWeights">
    /// One weight a node, $/h per rad²: above 0 for an angle that the site answers, 0 for an inner own bus, whose angle
    /// stays with the site.
    /// </param>
    /// <param name="lines">Every line with at least one end at an own bus.</param>
    /// <param name="unservedPricePerMwh">Public price of unserved and of spilled load, $/MWh, above 0.</param>
    public AngleSiteShape(
        int ownBuses,
        IReadOnlyList<double> copyWeights,
        IReadOnlyList<AngleSiteLine> lines,
        double unservedPricePerMwh)
    {
        ArgumentNullException.ThrowIfNull(copyWeights);
        ArgumentNullException.ThrowIfNull(lines);
        ArgumentOutOfRangeException.ThrowIfLessThan(ownBuses, 1);
        ArgumentOutOfRangeException.ThrowIfLessThan(copyWeights.Count, ownBuses, nameof(copyWeights));
        OwnBuses = ownBuses;
        CopyWeights = copyWeights;
        Lines = lines;
        UnservedPricePerMwh = unservedPricePerMwh;
        CheckWeights();
        CheckLines();
        if (!(unservedPricePerMwh > 0) || !double.IsFinite(unservedPricePerMwh))
            throw new ArgumentOutOfRangeException(nameof(unservedPricePerMwh), "The unserved price must be above 0 and finite.");
    }

    public int OwnBuses { get; }

    public IReadOnlyList<double> CopyWeights { get; }

    public IReadOnlyList<AngleSiteLine> Lines { get; }

    public double UnservedPricePerMwh { get; }

    /// <summary>Own and foreign buses.</summary>
    public int Nodes => CopyWeights.Count;

    /// <summary>Angles in an answer.</summary>
    public int Copies => CopyWeights.Count(weight => weight > 0);

    private void CheckWeights()
    {
        for (var node = 0; node < Nodes; node++)
        {
            var weight = CopyWeights[node];
            if (!(weight >= 0) || !double.IsFinite(weight) || (weight == 0 && node >= OwnBuses))
                throw new ArgumentException($"The weight of node {node} must be finite and above 0 (0 for an inner own bus).");
        }

        var used = CopyWeights.Where(weight => weight > 0).ToArray();
        if (used.Length > 0 && used.Max() > MaxRatio * used.Min())
            throw new ArgumentException($"Weights of one site may differ by a factor of {MaxRatio:0} at most.");
    }

    private void CheckLines()
    {
        foreach (var line in Lines)
        {
            if (line.From < 0 || line.From >= Nodes || line.To < 0 || line.To >= Nodes || line.From == line.To)
                throw new ArgumentException($"A line joins node {line.From} and node {line.To}; both must exist and differ.");
            if (line.From >= OwnBuses && line.To >= OwnBuses)
                throw new ArgumentException($"The line from node {line.From} to node {line.To} touches no own bus.");
            if (line.SusceptanceMwPerRad == 0 || !double.IsFinite(line.SusceptanceMwPerRad))
                throw new ArgumentException($"The susceptance between node {line.From} and node {line.To} must be finite and not 0.");
        }

        var sizes = Lines.Select(line => Math.Abs(line.SusceptanceMwPerRad)).ToArray();
        if (sizes.Length > 0 && sizes.Max() > MaxRatio * sizes.Min())
            throw new ArgumentException($"Susceptances of one site may differ by a factor of {MaxRatio:0} at most.");
    }
}
