namespace Halfvoice.Optimization;

/// <summary>
/// Where the interior-point method starts: every island's blocks at one common share of their ranges, chosen to come close to
/// the island's demand; no flows; a common price; multipliers that make all products of slack and multiplier alike.
/// </summary>
internal static class StartingPoint
{
    private const double LeastShare = 0.1;

    public static void Set(ScaledProgram program, Iterate point)
    {
        var share = Shares(program);
        double price = 0;
        for (var j = 0; j < program.FreeCount; j++)
        {
            double low = program.Lower[j], high = program.Upper[j];
            point.Value[j] = (double.IsFinite(low), double.IsFinite(high)) switch
            {
                (true, true) => low + (share[program.Graph.IslandOf[program.BusOf[j]]] * (high - low)),
                (true, false) => low + 1,
                (false, true) => high - 1,
                _ => 0,
            };
            price += program.Cost[j] + (program.Slope[j] * point.Value[j]);
        }

        Array.Fill(point.Price, program.FreeCount == 0 ? 0 : price / program.FreeCount);
        for (var j = 0; j < program.LimitedEnd; j++)
        {
            point.BelowSlack[j] = point.Value[j] - program.Lower[j];
            point.AboveSlack[j] = program.Upper[j] - point.Value[j];
            point.BelowDual[j] = double.IsNegativeInfinity(program.Lower[j]) ? 0 : Dual(point.BelowSlack[j]);
            point.AboveDual[j] = double.IsPositiveInfinity(program.Upper[j]) ? 0 : Dual(point.AboveSlack[j]);
        }
    }

    private static double Dual(double slack) => Math.Min(1e3, 1 / slack);

    private static double[] Shares(ScaledProgram program)
    {
        var islands = program.Graph.IslandCount;
        var need = new double[islands];
        var range = new double[islands];
        for (var i = 0; i < program.Demand.Length; i++)
            need[program.Graph.IslandOf[i]] += program.Demand[i];
        for (var j = 0; j < program.FreeCount; j++)
        {
            double low = program.Lower[j], high = program.Upper[j];
            if (!double.IsFinite(low) || !double.IsFinite(high))
                continue;
            var island = program.Graph.IslandOf[program.BusOf[j]];
            need[island] -= low;
            range[island] += high - low;
        }

        for (var island = 0; island < islands; island++)
            need[island] = range[island] > 0 ? Math.Clamp(need[island] / range[island], LeastShare, 1 - LeastShare) : 0.5;
        return need;
    }
}
