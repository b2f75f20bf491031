using Halfvoice.Grid;

namespace Halfvoice.Tests.Optimization;

/// <summary>Optimality conditions written from the problem statements, without the code under test.</summary>
internal static class SiteConditions
{
    /// <summary>Least and largest total that the generators find cheapest at prices within a tolerance of the given one.</summary>
    public static (double LeastMw, double MostMw) SupplyAround(Generator[] generators, double price, double tolerance) =>
        (generators.Sum(g => Cheapest(g, price - tolerance, false)), generators.Sum(g => Cheapest(g, price + tolerance, true)));

    private static double Cheapest(Generator generator, double price, bool tieHigh)
    {
        if (generator.CostQuadratic > 0)
            return Math.Clamp((price - generator.CostLinear) / (2 * generator.CostQuadratic), generator.MinMw, generator.MaxMw);
        return price > generator.CostLinear || (tieHigh && price == generator.CostLinear) ? generator.MaxMw : generator.MinMw;
    }
}
