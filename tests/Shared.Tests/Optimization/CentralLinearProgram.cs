using Google.OrTools.LinearSolver;
using Halfvoice.Grid;

namespace Halfvoice.Tests.Optimization;

/// <summary>The same problem written down with angles for a general-purpose simplex method (GLOP): the independent answer.</summary>
internal static class CentralLinearProgram
{
    public sealed record Answer(bool Solved, double CostPerHour, double[] DispatchMw, double[] PricePerMwh);

    /// <summary>Least cost; <see cref="Answer.Solved"/> is false when there is no feasible point.</summary>
    public static Answer Cheapest(Network network, double[] loadMw)
    {
        using var solver = NewSolver();
        var balances = Build(solver, network, loadMw, out var output);
        solver.Minimize(Sum(output.Select((p, g) => p * network.Generators[g].CostLinear)));
        var status = solver.Solve();
        Assert.True(status is Solver.ResultStatus.OPTIMAL or Solver.ResultStatus.INFEASIBLE or Solver.ResultStatus.ABNORMAL);
        if (status != Solver.ResultStatus.OPTIMAL)
            return new Answer(false, double.NaN, [], []);
        return new Answer(
            true,
            solver.Objective().Value() + network.Generators.Sum(plant => plant.CostFixed),
            Array.ConvertAll(output, p => p.SolutionValue()),
            Array.ConvertAll(balances, row => row.DualValue()));
    }

    /// <summary>Least total of load left out and power thrown away, MW.</summary>
    public static double LeastUnservedMw(Network network, double[] loadMw)
    {
        using var solver = NewSolver();
        var balances = Build(solver, network, loadMw, out _);
        var unserved = new List<Variable>();
        foreach (var balance in balances)
        {
            foreach (var sign in (int[])[1, -1])
            {
                var amount = solver.MakeNumVar(0, double.PositiveInfinity, "");
                balance.SetCoefficient(amount, sign);
                unserved.Add(amount);
            }
        }

        solver.Minimize(Sum(unserved.Select(amount => (LinearExpr)amount)));
        Assert.Equal(Solver.ResultStatus.OPTIMAL, solver.Solve());
        return solver.Objective().Value();
    }

    private static Solver NewSolver() => Solver.CreateSolver("GLOP");

    private static LinearExpr Sum(IEnumerable<LinearExpr> terms) => terms.ToArray().Sum();

    private static Constraint[] Build(Solver solver, Network network, double[] loadMw, out Variable[] output)
    {
        var balances = loadMw.Select(mw => solver.MakeConstraint(mw, mw)).ToArray();
        output = new Variable[network.Generators.Count];
        for (var g = 0; g < output.Length; g++)
        {
            var plant = network.Generators[g];
            output[g] = solver.MakeNumVar(plant.MinMw, plant.MaxMw, "");
            balances[plant.Bus].SetCoefficient(output[g], 1);
        }

        var angle = loadMw.Select(_ => solver.MakeNumVar(double.NegativeInfinity, double.PositiveInfinity, "")).ToArray();
        for (var l = 0; l < network.Lines.Count; l++)
        {
            var line = network.Lines[l];
            var flow = solver.MakeNumVar(-line.LimitMw, line.LimitMw, "");
            var law = solver.MakeConstraint(0, 0);
            law.SetCoefficient(flow, -1);
            // Angles in units of 1/base_mva rad, which keeps the coefficients small.
            law.SetCoefficient(angle[line.FromBus], 1 / line.ReactancePu);
            law.SetCoefficient(angle[line.ToBus], -1 / line.ReactancePu);
            balances[line.FromBus].SetCoefficient(flow, -1);
            balances[line.ToBus].SetCoefficient(flow, 1);
        }

        return balances;
    }
}
