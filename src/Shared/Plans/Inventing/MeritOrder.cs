using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>The cheapest dispatch of a load when no line limits it.</summary>
internal static class MeritOrder
{
    /// <summary>
    /// Minimises Σ c_g(p_g) with Σ p_g = load by bisection on the price λ: p_g(λ) is where the marginal cost
    /// b + 2a·p meets λ, within the plant's limits; plants with a = 0 switch at b and fill up together at the margin.
    /// </summary>
    /// <returns>Output of each plant, MW; null if the plants cannot meet the load.</returns>
    public static double[]? Dispatch(IReadOnlyList<Generator> plants, double loadMw)
    {
        if (plants.Count == 0 || loadMw > plants.Sum(plant => plant.MaxMw) || loadMw < plants.Sum(plant => plant.MinMw))
            return null;
        var low = plants.Min(plant => plant.MarginalCost(plant.MinMw)) - 1;
        var high = plants.Max(plant => plant.MarginalCost(plant.MaxMw)) + 1;
        for (var step = 0; step < 200 && high - low > 1e-10; step++)
        {
            var middle = 0.5 * (low + high);
            if (At(plants, middle).Sum() < loadMw)
                low = middle;
            else
                high = middle;
        }

        // The two ends differ in the plants at the margin alone; in between, the load is met exactly.
        var (under, over) = (At(plants, low), At(plants, high));
        var (underSum, overSum) = (under.Sum(), over.Sum());
        var share = overSum > underSum ? Math.Clamp((loadMw - underSum) / (overSum - underSum), 0, 1) : 0;
        return [.. under.Select((output, i) => output + (share * (over[i] - output)))];
    }

    private static double[] At(IReadOnlyList<Generator> plants, double price)
    {
        var output = new double[plants.Count];
        for (var i = 0; i < output.Length; i++)
        {
            var plant = plants[i];
            if (plant.CostQuadratic > 0)
                output[i] = Math.Clamp((price - plant.CostLinear) / (2 * plant.CostQuadratic), plant.MinMw, plant.MaxMw);
            else
                output[i] = price < plant.CostLinear ? plant.MinMw : plant.MaxMw;
        }

        return output;
    }
}
