namespace Halfvoice.Privacy;

/// <summary>
/// The site with several buses under scheme <c>angle</c>: the exact maximum over every set of held branches and every set
/// of buses whose injection is fixed (the others are marginal), for sites small enough to visit them all.
/// Proof: <c>angle.proof.md</c>, part 4.
/// </summary>
internal sealed class AreaAngleBound
{
    /// <summary>Limited branches and own buses together up to which all sets are visited.</summary>
    internal const int MaxSize = 18;

    private readonly AngleSiteShape _shape;
    private readonly AngleBranch[] _branches;
    private readonly AngleBranch[] _limited;
    private readonly HashSet<string> _visited = [];
    private double? _worst = 0;

    private AreaAngleBound(AngleSiteShape shape, AngleBranch[] branches)
    {
        _shape = shape;
        _branches = branches;
        _limited = [.. branches.Where(branch => branch.Limited)];
    }

    /// <summary>Null where the site is too large, or where a set's contradiction could not be settled.</summary>
    internal static SensitivityBound? For(AngleSiteShape shape, AngleBranch[] branches, double adjacencyMw)
    {
        var bound = new AreaAngleBound(shape, branches);
        if (bound._limited.Length + shape.OwnBuses > MaxSize)
            return null;
        if (shape.Copies > 0)
            bound.Visit(0, [.. Enumerable.Range(0, shape.Nodes)]);
        return bound._worst is { } perMw
            ? new SensitivityBound(perMw * adjacencyMw * AngleSensitivity.RoundingAllowance, SensitivityMethod.EveryActiveSet)
            : null;
    }

    /// <summary>Decides branch by branch; a branch whose ends already move together adds nothing by being held.</summary>
    private void Visit(int depth, int[] label)
    {
        if (_worst is null)
            return;
        if (depth == _limited.Length)
        {
            // Different held branches may bind the same nodes together; labels are least node numbers, so equal sets look equal.
            if (_visited.Add(string.Concat(label.Select(node => (char)node))))
                VisitBuses(new AreaGroups(_shape, _branches, label));
            return;
        }

        Visit(depth + 1, label);
        var (from, to) = (label[_limited[depth].From], label[_limited[depth].To]);
        var (keep, drop) = (Math.Min(from, to), Math.Max(from, to));
        if (keep != drop)
            Visit(depth + 1, [.. label.Select(x => x == drop ? keep : x)]);
    }

    private void VisitBuses(AreaGroups groups)
    {
        var movable = groups.Movable;
        for (var mask = 1; mask < 1 << movable.Length; mask++)
        {
            // Independent balances leave at least the common shift of all angles undetermined.
            var chosen = movable.Where((_, i) => ((mask >> i) & 1) == 1).ToArray();
            if (chosen.Length >= groups.Weight.Length)
                continue;
            if (AreaResponse.Worst(groups, chosen) is not { } response)
            {
                _worst = null;
                return;
            }

            _worst = Math.Max(_worst ?? 0, response);
        }
    }
}
