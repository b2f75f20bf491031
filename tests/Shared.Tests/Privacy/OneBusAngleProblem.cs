namespace Halfvoice.Tests.Privacy;

/// <summary>
/// A one-bus site under scheme angle with a solver of its own: at a price π outputs and angles follow from bisections, and
/// π is bisected until the bus balances. It shares nothing with the bound that it tries to beat.
/// </summary>
internal sealed class OneBusAngleProblem
{
    private const int Halvings = 90;

    internal required double OwnWeight { get; init; }

    internal required double OwnTarget { get; init; }

    /// <summary>Per neighbour: weight, target, summed susceptance, and the largest angle difference its lines allow.</summary>
    internal required (double Weight, double Target, double B, double Reach)[] Neighbours { get; init; }

    internal required (double Min, double Max, double A, double B)[] Plants { get; init; }

    internal required double Unserved { get; init; }

    /// <summary>All copies, own first. They are unique at a price, so a marginal plant of linear cost needs no care.</summary>
    internal double[] Solve(double load)
    {
        var low = -Unserved;
        var high = Unserved;
        for (var i = 0; i < Halvings; i++)
        {
            var price = (low + high) / 2;
            if (Produced(price) - load - Export(price, OwnAngle(price)) < 0)
                low = price;
            else
                high = price;
        }

        var found = (low + high) / 2;
        var own = OwnAngle(found);
        return [own, .. Neighbours.Select(n => Angle(n, own, found))];
    }

    private double Produced(double price)
    {
        var sum = 0.0;
        foreach (var g in Plants)
            sum += g.A == 0 ? (price >= g.B ? g.Max : g.Min) : Math.Clamp((price - g.B) / (2 * g.A), g.Min, g.Max);
        return sum;
    }

    private double Export(double price, double own)
    {
        var sum = 0.0;
        foreach (var n in Neighbours)
            sum += n.B * (own - Angle(n, own, price));
        return sum;
    }

    /// <summary>argmin of Σ w/2·(θ − a)² + π·export within the limits: its slope in θ₀, neighbours following, is Σ w·(θ − a).</summary>
    private double OwnAngle(double price)
    {
        var width = Math.Abs(OwnTarget) + 1;
        foreach (var n in Neighbours)
            width += Math.Abs(n.Target) + Unserved * Math.Abs(n.B) * (1 / n.Weight + 1 / OwnWeight);
        var (low, high) = (-width, width);
        var own = OwnTarget;
        for (var i = 0; i < Halvings; i++)
        {
            // Newton's step on a piecewise linear function ends on its piece; the bracket keeps it from going round in circles.
            var slope = OwnWeight * (own - OwnTarget);
            var steepness = OwnWeight;
            foreach (var n in Neighbours)
            {
                slope += n.Weight * (Angle(n, own, price) - n.Target);
                steepness += Math.Abs(own - Loose(n, price)) < n.Reach ? 0 : n.Weight;
            }

            (low, high) = slope < 0 ? (own, high) : (low, own);
            var next = own - slope / steepness;
            if (next == own)
                return own;
            own = next > low && next < high ? next : (low + high) / 2;
        }

        return own;
    }

    private static double Angle((double Weight, double Target, double B, double Reach) n, double own, double price) =>
        Math.Clamp(Loose(n, price), own - n.Reach, own + n.Reach);

    private static double Loose((double Weight, double Target, double B, double Reach) n, double price) =>
        n.Target + price * n.B / n.Weight;
}
