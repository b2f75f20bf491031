using Google.OrTools.LinearSolver;
using Halfvoice.Grid;

namespace Halfvoice.Tests.Plans;

/// <summary>
/// Whether a load can be served within all limits, asked of a general LP solver: plants and angles as variables, a
/// balance at each bus, a flow limit on each line.
/// </summary>
internal static class DispatchByLp
{
    /// <summary>The cost of the cheapest dispatch, $/h without fixed costs, quadratic costs cut into pieces; null if there is none.</summary>
    /// <param name="network">The grid.</param>
    /// <param name="loadMw">Load of each bus.</param>
    /// <param name="limitFactor">Multiplies every line limit; infinity lifts them all.</param>
    /// <param name="pieces">Pieces that each quadratic cost is cut into.</param>
    public static double? CheapestCost(Network network, double[] loadMw, double limitFactor, int pieces = 1)
    {
        using var solver = Solver.CreateSolver("GLOP");
        var balance = Array.ConvertAll(loadMw, load => solver.MakeConstraint(load, load));
        var objective = solver.Objective();
        var constant = 0.0;
        foreach (var plant in network.Generators)
        {
            balance[plant.Bus].SetBounds(balance[plant.Bus].Lb() - plant.MinMw, balance[plant.Bus].Ub() - plant.MinMw);
            constant += plant.CostPerHour(plant.MinMw) - plant.CostFixed;
            for (var piece = 0; piece < pieces && plant.RangeMw > 0; piece++)
            {
                var (from, to) = (plant.MinMw + (plant.RangeMw * piece / pieces), plant.MinMw + (plant.RangeMw * (piece + 1) / pieces));
                var output = solver.MakeNumVar(0, to - from, "");
                balance[plant.Bus].SetCoefficient(output, 1);
                objective.SetCoefficient(output, (plant.CostPerHour(to) - plant.CostPerHour(from)) / (to - from));
            }
        }

        var angle = Array.ConvertAll(loadMw, _ => solver.MakeNumVar(double.NegativeInfinity, double.PositiveInfinity, ""));
        for (var l = 0; l < network.Lines.Count; l++)
        {
            var line = network.Lines[l];
            var limit = double.IsInfinity(line.LimitMw) || double.IsInfinity(limitFactor) ? double.PositiveInfinity : line.LimitMw * limitFactor;
            var flow = solver.MakeNumVar(-limit, limit, "");
            balance[line.FromBus].SetCoefficient(flow, -1);
            balance[line.ToBus].SetCoefficient(flow, 1);
            var law = solver.MakeConstraint(0, 0);
            law.SetCoefficient(flow, 1);
            law.SetCoefficient(angle[line.FromBus], -network.SusceptanceMwPerRad(l));
            law.SetCoefficient(angle[line.ToBus], network.SusceptanceMwPerRad(l));
        }

        objective.SetMinimization();
        return solver.Solve() == Solver.ResultStatus.OPTIMAL ? objective.Value() + constant : null;
    }
}
