using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

/// <summary>The problem of a site with several buses under scheme angle, solved as a general quadratic program.</summary>
internal sealed class AreaAngleProblem
{
    internal required int OwnBuses { get; init; }

    /// <summary>Weight and target of every node's angle; weight 0 for an inner bus.</summary>
    internal required (double Weight, double Target)[] Nodes { get; init; }

    internal required (int From, int To, double B, double Limit)[] Lines { get; init; }

    internal required (int Bus, double Min, double Max, double Quadratic, double Linear)[] Plants { get; init; }

    internal required double Unserved { get; init; }

    /// <summary>The worst error of the solutions so far; above 1e-11 they are no yardstick.</summary>
    internal double Error { get; private set; }

    internal AngleSiteShape Shape(double priceForBound) => new(
        OwnBuses,
        [.. Nodes.Select(node => node.Weight)],
        [.. Lines.Select(line => new AngleSiteLine(line.From, line.To, line.B, double.IsFinite(line.Limit)))],
        priceForBound);

    /// <summary>All copies' angles at the loads of the own buses.</summary>
    internal double[] Solve(double[] load)
    {
        // x = plants, unserved and spilled load of each own bus, angles.
        var angle = Plants.Length + 2 * OwnBuses;
        var n = angle + Nodes.Length;
        var hessian = new double[n, n];
        var cost = new double[n];
        var equal = new double[OwnBuses, n];
        var rows = new List<(double[] Row, double Limit)>();
        for (var g = 0; g < Plants.Length; g++)
        {
            hessian[g, g] = 2 * Plants[g].Quadratic;
            cost[g] = Plants[g].Linear;
            equal[Plants[g].Bus, g] = 1;
            rows.Add((Row(n, (g, 1)), Plants[g].Max));
            rows.Add((Row(n, (g, -1)), -Plants[g].Min));
        }

        for (var i = 0; i < OwnBuses; i++)
        {
            var (shed, spill) = (Plants.Length + 2 * i, Plants.Length + 2 * i + 1);
            cost[shed] = cost[spill] = Unserved;
            equal[i, shed] = 1;
            equal[i, spill] = -1;
            rows.Add((Row(n, (shed, -1)), 0));
            rows.Add((Row(n, (spill, -1)), 0));
        }

        for (var node = 0; node < Nodes.Length; node++)
        {
            hessian[angle + node, angle + node] = Nodes[node].Weight;
            cost[angle + node] = -Nodes[node].Weight * Nodes[node].Target;
        }

        foreach (var (from, to, b, limit) in Lines)
        {
            foreach (var (bus, other) in new[] { (from, to), (to, from) })
            {
                if (bus >= OwnBuses)
                    continue;
                equal[bus, angle + bus] -= b;
                equal[bus, angle + other] += b;
            }

            if (!double.IsFinite(limit))
                continue;
            rows.Add((Row(n, (angle + from, b), (angle + to, -b)), limit));
            rows.Add((Row(n, (angle + from, -b), (angle + to, b)), limit));
        }

        var less = new double[rows.Count, n];
        for (var i = 0; i < rows.Count; i++)
        {
            for (var j = 0; j < n; j++)
                less[i, j] = rows[i].Row[j];
        }

        var solver = new ConvexQuadratic(hessian, cost, equal, load, less, [.. rows.Select(row => row.Limit)]);
        var x = solver.Solve();
        Error = Math.Max(Error, solver.Error);
        return [.. Enumerable.Range(0, Nodes.Length).Where(node => Nodes[node].Weight > 0).Select(node => x[angle + node])];
    }

    private static double[] Row(int n, params (int At, double Value)[] entries)
    {
        var row = new double[n];
        foreach (var (at, value) in entries)
            row[at] = value;
        return row;
    }
}
