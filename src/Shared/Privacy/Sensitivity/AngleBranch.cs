namespace Halfvoice.Privacy;

/// <summary>
/// All lines between one pair of nodes as one: their flows depend on the same angle difference, so susceptances add up,
/// and the pair is rigid as soon as any one of its lines is at its limit.
/// </summary>
internal readonly record struct AngleBranch(int From, int To, double Susceptance, bool Limited)
{
    /// <summary>Sums of parallel susceptances this far below their parts have lost too many digits to be relied on.</summary>
    private const double CancellationLimit = 1e-6;

    /// <summary>
    /// The branches of a site, in order of their first line; null where parallel susceptances of either sign cancel
    /// almost but not quite, so that no bound which divides by them could be trusted.
    /// </summary>
    internal static AngleBranch[]? Of(AngleSiteShape shape)
    {
        var branches = new List<AngleBranch>();
        foreach (var pair in shape.Lines.GroupBy(line => (Math.Min(line.From, line.To), Math.Max(line.From, line.To))))
        {
            var parts = pair.Select(line => line.SusceptanceMwPerRad).ToArray();
            var sum = parts.Sum();
            var size = parts.Sum(Math.Abs);
            if (Math.Abs(sum) < CancellationLimit * size)
            {
                if (!IsExactlyZero(parts))
                    return null;
                sum = 0;
            }

            branches.Add(new AngleBranch(pair.Key.Item1, pair.Key.Item2, sum, pair.Any(line => line.Limited)));
        }

        return [.. branches];
    }

    private static bool IsExactlyZero(double[] parts)
    {
        ExactFraction sum = 0;
        foreach (var part in parts)
            sum += ExactFraction.FromDouble(part);
        return sum == 0;
    }
}
