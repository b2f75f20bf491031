using Halfvoice.Optimization;
using MathNet.Numerics.LinearAlgebra;

namespace Halfvoice.Tests.Optimization;

/// <summary>
/// The Karush-Kuhn-Tucker conditions of a several-bus site problem, from its statement in all angles. Inner angles,
/// which the answer does not show, come from the balances by least squares; line multipliers, which it does not show
/// either, are looked for by non-negative least squares.
/// </summary>
internal static class SiteAreaConditions
{
    private const double Tolerance = 1e-7;

    /// <summary>Checks an answer and returns how many lines stand at their limit.</summary>
    public static int Check(AreaInstance instance, AreaAnswer answer, string where)
    {
        var angles = AllAngles(instance, answer, where);
        var model = instance.Model;
        var flows = model.Lines.Select(line => line.SusceptanceMwPerRad * (angles[line.From] - angles[line.To])).ToArray();
        var size = 1 + flows.Concat(instance.LoadMw).Select(Math.Abs).DefaultIfEmpty(0).Max();
        var columns = new List<double[]>();
        var atLimit = 0;
        for (var l = 0; l < flows.Length; l++)
        {
            var line = model.Lines[l];
            var slack = Tolerance * size;
            Assert.True(Math.Abs(flows[l]) <= line.LimitMw + slack, $"{where}: flow {flows[l]} over {line.LimitMw}");
            if (Math.Abs(flows[l]) < line.LimitMw - slack)
                continue;
            atLimit++;
            if (flows[l] > -slack)
                columns.Add(Pull(model, line, 1));
            if (flows[l] < slack)
                columns.Add(Pull(model, line, -1));
        }

        CheckPrices(instance, answer, where);
        CheckAngles(instance, answer, angles, columns, where);
        return atLimit;
    }

    private static double[] AllAngles(AreaInstance instance, AreaAnswer answer, string where)
    {
        var model = instance.Model;
        var angles = new double[model.NodeCount];
        for (var c = 0; c < answer.CopiesRad.Length; c++)
            angles[model.CopyNodes[c]] = answer.CopiesRad[c];
        var inner = Enumerable.Range(0, model.OwnBusCount).Except(model.CopyNodes).ToArray();
        var need = Vector<double>.Build.Dense(model.OwnBusCount, b => answer.UnservedMw[b] - instance.LoadMw[b]);
        for (var g = 0; g < answer.OutputMw.Length; g++)
            need[model.Generators[g].Bus] += answer.OutputMw[g];
        var laplacian = Matrix<double>.Build.Dense(model.OwnBusCount, model.NodeCount);
        foreach (var line in model.Lines)
        {
            foreach (var (at, other) in new[] { (line.From, line.To), (line.To, line.From) }.Where(end => end.Item1 < model.OwnBusCount))
            {
                laplacian[at, at] += line.SusceptanceMwPerRad;
                laplacian[at, other] -= line.SusceptanceMwPerRad;
            }
        }

        if (inner.Length > 0 && model.Lines.Count > 0)
        {
            var unknown = Matrix<double>.Build.DenseOfColumnVectors(inner.Select(laplacian.Column));
            var found = unknown.PseudoInverse() * (need - (laplacian * Vector<double>.Build.Dense(angles)));
            for (var k = 0; k < inner.Length; k++)
                angles[inner[k]] = found[k];
        }

        var gap = (need - (laplacian * Vector<double>.Build.Dense(angles))).InfinityNorm();
        Assert.True(gap <= Tolerance * (1 + need.InfinityNorm() + instance.LoadMw.Max(Math.Abs)), $"{where}: balance is off by {gap}");
        return angles;
    }

    /// <summary>Each generator is at its cheapest for its bus's price; shedding needs price V, spilling −V.</summary>
    private static void CheckPrices(AreaInstance instance, AreaAnswer answer, string where)
    {
        var limit = instance.Model.UnservedPricePerMwh;
        for (var g = 0; g < answer.OutputMw.Length; g++)
        {
            var generator = instance.Model.Generators[g];
            var price = answer.PricePerMwh[generator.Bus];
            var (least, most) = SiteConditions.SupplyAround([generator], price, Tolerance * (1 + Math.Abs(price)));
            Assert.True(
                answer.OutputMw[g] >= least - 1e-6 && answer.OutputMw[g] <= most + 1e-6,
                $"{where}: output {answer.OutputMw[g]} of {generator} at price {price}");
        }

        for (var b = 0; b < answer.UnservedMw.Length; b++)
        {
            var price = answer.PricePerMwh[b];
            Assert.InRange(price, -limit, limit);
            if (Math.Abs(answer.UnservedMw[b]) > 1e-6)
                Assert.Equal(Math.Sign(answer.UnservedMw[b]) * limit, price, Tolerance * limit);
        }
    }

    /// <summary>w_n (θ_n − a_n) + Σ_l ∂flow_l/∂θ_n · (ν_from − ν_to + m_l) = 0 at every node, some m_l of the right signs.</summary>
    private static void CheckAngles(
        AreaInstance instance, AreaAnswer answer, double[] angles, List<double[]> columns, string where)
    {
        var model = instance.Model;
        var residual = new double[model.NodeCount];
        var scale = 1.0;
        for (var c = 0; c < model.CopyNodes.Count; c++)
        {
            var node = model.CopyNodes[c];
            residual[node] = model.CopyWeights[c] * (angles[node] - instance.AnchorRad[c]);
            scale = Math.Max(scale, model.CopyWeights[c]);
        }

        foreach (var line in model.Lines)
        {
            var price = (line.From < model.OwnBusCount ? answer.PricePerMwh[line.From] : 0)
                - (line.To < model.OwnBusCount ? answer.PricePerMwh[line.To] : 0);
            residual[line.From] += line.SusceptanceMwPerRad * price;
            residual[line.To] -= line.SusceptanceMwPerRad * price;
            scale = Math.Max(scale, Math.Abs(line.SusceptanceMwPerRad * price));
        }

        var left = NonNegativeLeastSquares.Residual(columns, residual);
        Assert.True(left <= Tolerance * scale, $"{where}: angles are off by {left} at scale {scale}");
    }

    private static double[] Pull(AreaModel model, AreaLine line, int sign)
    {
        var column = new double[model.NodeCount];
        column[line.From] = -sign * line.SusceptanceMwPerRad;
        column[line.To] = sign * line.SusceptanceMwPerRad;
        return column;
    }
}

/// <summary>min |Σ m_k column_k − target| over m ≥ 0 by the active-set method of Lawson and Hanson (1974, from memory).</summary>
internal static class NonNegativeLeastSquares
{
    /// <summary>Largest entry of what is left of the target.</summary>
    public static double Residual(List<double[]> columns, double[] target)
    {
        var goal = Vector<double>.Build.Dense(target);
        if (columns.Count == 0)
            return goal.InfinityNorm();
        var matrix = Matrix<double>.Build.DenseOfColumns(columns);
        var free = new SortedSet<int>();
        var best = Vector<double>.Build.Dense(columns.Count);
        for (var step = 0; step < 20 * columns.Count; step++)
        {
            var gradient = matrix.TransposeThisAndMultiply(goal - (matrix * best));
            var candidates = Enumerable.Range(0, columns.Count).Where(k => !free.Contains(k)).ToArray();
            if (candidates.Length == 0)
                break;
            var entering = candidates.MaxBy(k => gradient[k] / matrix.Column(k).L2Norm());
            if (gradient[entering] <= 1e-13 * matrix.Column(entering).L2Norm() * (1 + goal.L2Norm()))
                break;
            free.Add(entering);
            best = Refit(matrix, goal, free, best);
        }

        return (goal - (matrix * best)).InfinityNorm();
    }

    private static Vector<double> Refit(Matrix<double> matrix, Vector<double> goal, SortedSet<int> free, Vector<double> best)
    {
        while (true)
        {
            var chosen = free.ToArray();
            var part = Matrix<double>.Build.DenseOfColumnVectors(chosen.Select(matrix.Column)).PseudoInverse() * goal;
            var wanted = Vector<double>.Build.Dense(best.Count);
            for (var k = 0; k < chosen.Length; k++)
                wanted[chosen[k]] = part[k];
            var negative = chosen.Where(k => wanted[k] <= 0).ToArray();
            if (negative.Length == 0)
                return wanted;
            var share = negative.Min(k => best[k] - wanted[k] > 0 ? best[k] / (best[k] - wanted[k]) : 0);
            best += share * (wanted - best);
            foreach (var k in negative.Where(k => best[k] <= 1e-15 * (1 + best.InfinityNorm())))
                free.Remove(k);
            free.RemoveWhere(k => best[k] <= 0);
            if (free.Count == 0)
                return Vector<double>.Build.Dense(best.Count);
        }
    }
}
