namespace Halfvoice.Privacy;

/// <summary>
/// An upper bound on the one-bus maximum for sites with too many limited lines to enumerate. For each number of free
/// neighbours and of held copies it replaces every sum by its extreme over sets of that size; with equal weights and
/// equal susceptances it is exact. Proof: <c>angle.proof.md</c>, part 2.
/// </summary>
internal sealed class OneBusAngleRelaxation
{
    private readonly double _ownWeight;
    private readonly double[] _heldLeast;
    private readonly double[] _heldMost;
    private readonly double[] _swayLeast;
    private readonly double[] _inverseMost;
    private readonly double _weightLeast;
    private readonly double _weightMost;
    private readonly bool _oneSign;
    private readonly int _stiffLimited;
    private readonly int _stiffFree;
    private readonly int _idleLimited;

    private OneBusAngleRelaxation(AngleSiteShape shape, AngleBranch[] branches)
    {
        var weights = shape.CopyWeights;
        var stiff = branches.Where(branch => branch.Susceptance != 0).ToArray();
        var held = branches.Where(branch => branch.Limited).Select(branch => weights[branch.To]).ToArray();
        var mayHold = stiff.Where(branch => branch.Limited).ToArray();
        var always = stiff.Where(branch => !branch.Limited).ToArray();
        double Sway(AngleBranch branch) => Math.Abs(branch.Susceptance) / weights[branch.To];
        double Inverse(AngleBranch branch) => 1 / weights[branch.To];
        _ownWeight = weights[0];
        _heldLeast = Running(0, held.Order());
        _heldMost = Running(0, held.OrderDescending());
        _swayLeast = Running(always.Sum(Sway), mayHold.Select(Sway).Order());
        _inverseMost = Running(always.Sum(Inverse), mayHold.Select(Inverse).OrderDescending());
        _weightLeast = stiff.Select(branch => weights[branch.To]).DefaultIfEmpty(1).Min();
        _weightMost = stiff.Select(branch => weights[branch.To]).DefaultIfEmpty(1).Max();
        _oneSign = stiff.All(branch => branch.Susceptance > 0) || stiff.All(branch => branch.Susceptance < 0);
        _stiffLimited = mayHold.Length;
        _stiffFree = always.Length;
        _idleLimited = held.Length - mayHold.Length;
    }

    internal static double For(AngleSiteShape shape, AngleBranch[] branches)
    {
        var relaxation = new OneBusAngleRelaxation(shape, branches);
        var worst = 0.0;
        for (var released = 0; released <= relaxation._stiffLimited; released++)
        {
            // Without a free neighbour that carries anything, the export cannot move.
            if (released + relaxation._stiffFree == 0)
                continue;

            // Held are the limited ones that are not released, and any number of those that carry nothing.
            var held = relaxation._stiffLimited - released;
            for (var idle = 0; idle <= relaxation._idleLimited; idle++)
                worst = Math.Max(worst, relaxation.AtCounts(released, held + idle));
        }

        return worst;
    }

    /// <summary>
    /// With α = k·|B|/W₀ and β = Σ_U |b|/w the response is at most (α + β)/(c·α² + e·β²), c = W₀/k², e = 1/Σ_U (1/w)
    /// (Cauchy-Schwarz on β); as (1 + r)/(β·(c·r² + e)) with r = α/β it rises to r = √(1 + e/c) − 1 and falls after.
    /// </summary>
    private double AtCounts(int released, int held)
    {
        double k = held + 1;
        var heldLeast = _ownWeight + _heldLeast[held];
        var c = heldLeast / (k * k);
        var e = 1 / _inverseMost[released];
        var highest = k / heldLeast * _weightMost;
        var lowest = _oneSign ? k / (_ownWeight + _heldMost[held]) * _weightLeast : 0;
        var r = Math.Clamp(Math.Sqrt(1 + e / c) - 1, lowest, highest);
        return (1 + r) / (_swayLeast[released] * (c * r * r + e));
    }

    /// <summary>The start with the first 0, 1, 2, … values added.</summary>
    private static double[] Running(double start, IEnumerable<double> values)
    {
        var sums = new List<double> { start };
        foreach (var value in values)
            sums.Add(sums[^1] + value);
        return [.. sums];
    }
}
