namespace Halfvoice.Privacy;

/// <summary>
/// The one-bus site under scheme <c>angle</c>. With U the neighbours not held by a line limit, B = Σ_U b, W₀ the weight
/// of the own copy and of all held copies, k their number, the L1 response per MW is
/// (k·|B|/W₀ + Σ_U |b|/w) / (B²/W₀ + Σ_U b²/w); the bound is its maximum over U. With equal weights that is
/// 2B/(B²/(1 + n − |U|) + Q). Proof: <c>angle.proof.md</c>, part 1.
/// </summary>
internal sealed class OneBusAngleBound
{
    private readonly AngleBranch[] _free;
    private readonly AngleBranch[] _limited;
    private readonly IReadOnlyList<double> _weights;
    private double _worst;

    private OneBusAngleBound(AngleSiteShape shape, AngleBranch[] branches)
    {
        _weights = shape.CopyWeights;
        _free = [.. branches.Where(branch => !branch.Limited)];
        _limited = [.. branches.Where(branch => branch.Limited)];
    }

    internal static SensitivityBound? For(AngleSiteShape shape, AngleBranch[] branches, double adjacencyMw, int enumerateUpTo)
    {
        // An own angle that is not answered means that the site has no neighbour, and so no copies at all.
        if (shape.CopyWeights[0] == 0)
            return null;
        var bound = new OneBusAngleBound(shape, branches);
        var exact = bound._limited.Length <= enumerateUpTo;
        var perMw = exact ? bound.Enumerate() : OneBusAngleRelaxation.For(shape, branches);
        return new SensitivityBound(
            perMw * adjacencyMw * AngleSensitivity.RoundingAllowance,
            exact ? SensitivityMethod.EveryActiveSet : SensitivityMethod.RelaxedActiveSets);
    }

    private double Enumerate()
    {
        var sums = new Sums(0, 0, 0, _weights[0], 1);
        foreach (var branch in _free)
            sums = sums.WithFree(branch.Susceptance, _weights[branch.To]);
        Visit(0, sums);
        return _worst;
    }

    private void Visit(int depth, Sums sums)
    {
        if (depth == _limited.Length)
        {
            _worst = Math.Max(_worst, sums.L1PerMw);
            return;
        }

        var branch = _limited[depth];
        var weight = _weights[branch.To];
        Visit(depth + 1, sums.WithFree(branch.Susceptance, weight));
        Visit(depth + 1, sums with { HeldWeight = sums.HeldWeight + weight, Held = sums.Held + 1 });
    }

    /// <summary>B, Σ_U |b|/w, Σ_U b²/w, W₀ and k of the set so far.</summary>
    private readonly record struct Sums(double Total, double Sway, double Compliance, double HeldWeight, int Held)
    {
        /// <summary>No free neighbour with a susceptance means that the export, and so the answer, cannot move.</summary>
        internal double L1PerMw => Compliance == 0
            ? 0
            : (Held * Math.Abs(Total) / HeldWeight + Sway) / (Total * Total / HeldWeight + Compliance);

        internal Sums WithFree(double susceptance, double weight) => this with
        {
            Total = Total + susceptance,
            Sway = Sway + Math.Abs(susceptance) / weight,
            Compliance = Compliance + susceptance * susceptance / weight,
        };
    }
}
