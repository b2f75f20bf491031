using System.Numerics;

namespace Halfvoice.Privacy;

/// <summary>
/// A site's nodes with the held branches contracted: nodes of one group move together, because the angle difference along
/// a held branch cannot change. Rows are the own buses' balances in terms of the groups' movements.
/// </summary>
internal sealed class AreaGroups
{
    private readonly AngleSiteShape _shape;
    private readonly int[] _group;

    /// <param name="shape">The site.</param>
    /// <param name="branches">Its branches.</param>
    /// <param name="label">One label a node; nodes of equal label form a group.</param>
    internal AreaGroups(AngleSiteShape shape, AngleBranch[] branches, int[] label)
    {
        _shape = shape;
        _group = new int[label.Length];
        var labels = label.Distinct().ToArray();
        Weight = new double[labels.Length];
        Copies = new int[labels.Length];
        for (var node = 0; node < label.Length; node++)
        {
            _group[node] = Array.IndexOf(labels, label[node]);
            Weight[_group[node]] += shape.CopyWeights[node];
            Copies[_group[node]] += shape.CopyWeights[node] > 0 ? 1 : 0;
        }

        Balance = new double[shape.OwnBuses, labels.Length];
        var movable = new SortedSet<int>();
        foreach (var branch in branches.Where(branch => branch.Susceptance != 0 && _group[branch.From] != _group[branch.To]))
        {
            foreach (var (bus, other) in new[] { (branch.From, branch.To), (branch.To, branch.From) })
            {
                if (bus >= shape.OwnBuses)
                    continue;
                movable.Add(bus);
                Balance[bus, _group[bus]] += branch.Susceptance;
                Balance[bus, _group[other]] -= branch.Susceptance;
            }
        }

        Movable = [.. movable];
    }

    /// <summary>Sum of the copies' weights in each group; 0 for a group of inner buses alone.</summary>
    internal double[] Weight { get; }

    /// <summary>Copies in each group.</summary>
    internal int[] Copies { get; }

    /// <summary>Change of an own bus's net injection per rad of a group's movement, MW/rad.</summary>
    internal double[,] Balance { get; }

    /// <summary>Own buses whose net injection can change at all while the held branches are held.</summary>
    internal int[] Movable { get; }

    /// <summary>The exact rank of the balances of some buses in some groups, from the susceptances as given.</summary>
    internal int Rank(IReadOnlyList<int> buses, IReadOnlyList<int> groups)
    {
        // One power of two makes every susceptance an integer; a common factor leaves the rank alone.
        var shift = 52 - _shape.Lines.Min(line => Math.ILogB(line.SusceptanceMwPerRad));
        var matrix = new BigInteger[buses.Count, groups.Count];
        foreach (var line in _shape.Lines.Where(line => _group[line.From] != _group[line.To]))
        {
            var value = (ExactFraction.FromDouble(line.SusceptanceMwPerRad) * ExactFraction.PowerOfTwo(shift)).Numerator;
            for (var row = 0; row < buses.Count; row++)
            {
                if (buses[row] != line.From && buses[row] != line.To)
                    continue;
                var own = _group[buses[row]];
                var other = _group[buses[row] == line.From ? line.To : line.From];
                for (var column = 0; column < groups.Count; column++)
                    matrix[row, column] += groups[column] == own ? value : groups[column] == other ? -value : BigInteger.Zero;
            }
        }

        return ExactRank.Of(matrix);
    }
}
