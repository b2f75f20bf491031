using System.Diagnostics;
using System.Globalization;
using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Benchmarks;

/// <summary>
/// Time and allocation of the exact site problems, each beside a baseline measured in the same run: the one-bus problems
/// beside the same problem on the general dense solver, the several-bus problem beside itself without a head start.
/// </summary>
public static class SiteProblemBenchmark
{
    private const int Batches = 31;

    /// <summary>Answers are summed here, so that no compiler may leave a solve out.</summary>
    private static double s_sum;

    private static readonly Generator[] Plants =
    [
        new("hydro", 0, 10, 180, 0.02, 18), new("gas", 0, 0, 240, 0.05, 34), new("peaker", 0, 0, 90, 0.11, 52),
    ];

    /// <summary>Prints one line a problem. An argument, if given, is the number of solves in a batch (default 20,000).</summary>
    public static int Run(string[] args)
    {
        var solves = args.Length > 0 ? int.Parse(args[0], CultureInfo.InvariantCulture) : 20_000;
        Console.WriteLine("site problem                                        ns/solve   bytes/solve   baseline ns   ratio");
        Print("response of one bus, 3 generators", solves, Response(), ResponseOnDenseSolver());
        Print("nodal angle, 4 lines, 2 generators, limits free", solves, Nodal(1e4), NodalOnDenseSolver(1e4));
        Print("nodal angle, 4 lines, 2 generators, limits binding", solves, Nodal(25), NodalOnDenseSolver(25));
        Print("area, 20 buses, 30 lines, 5 ties, warm against cold", Math.Max(1, solves / 100), Area(false), Area(true));
        Console.WriteLine(string.Create(CultureInfo.InvariantCulture, $"sum of answers {s_sum:E3}"));
        return 0;
    }

    private static void Print(string name, int solves, Func<int, double> problem, Func<int, double> baseline)
    {
        var baseSolves = Math.Max(1, solves / 10);
        Repeat(2 * solves, problem);
        Repeat(2 * baseSolves, baseline);
        double[] ns = new double[Batches], baseNs = new double[Batches];
        var bytes = 0L;
        for (var batch = 0; batch < Batches; batch++)
        {
            // Batches take turns and the quickest counts, since other load on the machine only ever adds.
            var before = GC.GetAllocatedBytesForCurrentThread();
            ns[batch] = Repeat(solves, problem);
            bytes += GC.GetAllocatedBytesForCurrentThread() - before;
            baseNs[batch] = Repeat(baseSolves, baseline);
        }

        var (best, baseBest) = (ns.Min(), baseNs.Min());
        Console.WriteLine(string.Create(
            CultureInfo.InvariantCulture,
            $"{name,-50} {best,9:F0} {bytes / (double)solves / Batches,13:F1} {baseBest,13:F0} {baseBest / best,7:F1}"));
    }

    private static double Repeat(int solves, Func<int, double> solve)
    {
        var start = Stopwatch.GetTimestamp();
        for (var k = 0; k < solves; k++)
            s_sum += solve(k);
        return Stopwatch.GetElapsedTime(start).TotalNanoseconds / solves;
    }

    private static Func<int, double> Response()
    {
        var supply = new SupplyCurve(Plants);
        return k => supply.Respond(Target(k), 0.1);
    }

    /// <summary>min Σ a p² + b p + ρ/2 (Σ p − t)²: curvature 2a on the diagonal and ρ everywhere.</summary>
    private static Func<int, double> ResponseOnDenseSolver()
    {
        const double penalty = 0.1;
        var n = Plants.Length;
        var hessian = new double[n * n];
        Array.Fill(hessian, penalty);
        var rows = new double[n * n];
        for (var g = 0; g < n; g++)
        {
            hessian[(g * n) + g] += 2 * Plants[g].CostQuadratic;
            rows[(g * n) + g] = 1;
        }

        var solver = new DualActiveSet(hessian, n, rows, 0);
        var lower = Plants.Select(plant => plant.MinMw).ToArray();
        var upper = Plants.Select(plant => plant.MaxMw).ToArray();
        double[] linear = new double[n], x = new double[n], multipliers = new double[n];
        return k =>
        {
            for (var g = 0; g < n; g++)
                linear[g] = Plants[g].CostLinear - (penalty * Target(k));
            solver.Solve(linear, lower, upper, x, multipliers);
            return x[0];
        };
    }

    private static double Target(int k) => 50 + (k % 97 * 6.0);

    private static readonly double[] Weights = [4e5, 2e5, 3e5, 2.5e5, 3.5e5];

    private static readonly double[] Susceptances = [900, 1400, 600, 2100];

    private static void Anchors(int k, double[] anchors)
    {
        for (var c = 0; c < anchors.Length; c++)
            anchors[c] = 0.03 * ((((k * 31) + (c * 17)) % 23) - 11) / 11;
    }

    private static Func<int, double> Nodal(double limitMw)
    {
        var lines = Susceptances.Select((susceptance, c) => new NodalLine(c + 1, susceptance, limitMw)).ToArray();
        var problem = new NodalAngleProblem(new SupplyCurve(Plants.AsSpan(0, 2).ToArray()), Weights, lines, 5000);
        double[] anchors = new double[5], copies = new double[5];
        return k =>
        {
            Anchors(k, anchors);
            return problem.Solve(140 + (k % 13 * 10), anchors, copies).OutputMw;
        };
    }

    /// <summary>The same problem without shedding, which these loads do not need: five angles, two outputs.</summary>
    private static Func<int, double> NodalOnDenseSolver(double limitMw)
    {
        const int n = 7;
        var hessian = new double[n * n];
        var rows = new double[n * n];
        for (var c = 0; c < Weights.Length; c++)
            hessian[(c * n) + c] = Weights[c];
        for (var l = 0; l < Susceptances.Length; l++)
        {
            rows[0] -= Susceptances[l];
            rows[l + 1] = Susceptances[l];
            rows[((l + 1) * n) + 0] = Susceptances[l];
            rows[((l + 1) * n) + l + 1] = -Susceptances[l];
        }

        double[] lower = [0, -limitMw, -limitMw, -limitMw, -limitMw, 0, 0], upper = [0, limitMw, limitMw, limitMw, limitMw, 0, 0];
        for (var g = 0; g < 2; g++)
        {
            hessian[((5 + g) * n) + 5 + g] = 2 * Plants[g].CostQuadratic;
            rows[5 + g] = 1;
            rows[((5 + g) * n) + 5 + g] = 1;
            (lower[5 + g], upper[5 + g]) = (Plants[g].MinMw, Plants[g].MaxMw);
        }

        var solver = new DualActiveSet(hessian, n, rows, 1);
        double[] anchors = new double[5], linear = new double[n], x = new double[n], multipliers = new double[n];
        return k =>
        {
            Anchors(k, anchors);
            for (var c = 0; c < anchors.Length; c++)
                linear[c] = -Weights[c] * anchors[c];
            (linear[5], linear[6]) = (Plants[0].CostLinear, Plants[1].CostLinear);
            lower[0] = upper[0] = 140 + (k % 13 * 10);
            solver.Solve(linear, lower, upper, x, multipliers);
            return x[0];
        };
    }

    /// <summary>A ring of 20 buses with ten chords and five tie lines; the anchors drift as they do from round to round.</summary>
    private static Func<int, double> Area(bool cold)
    {
        const int own = 20;
        var lines = new List<AreaLine>();
        for (var bus = 0; bus < own; bus++)
            lines.Add(new AreaLine(bus, (bus + 1) % own, 1200 + (90 * bus), 160));
        for (var chord = 0; chord < 10; chord++)
            lines.Add(new AreaLine(chord, (chord * 7 + 9) % own, 800 + (50 * chord), 60 + (10 * chord)));
        for (var tie = 0; tie < 5; tie++)
            lines.Add(new AreaLine(4 * tie, own + tie, 1500, 80));
        lines.RemoveAll(line => line.From == line.To);
        var copyNodes = Enumerable.Range(0, 5).Select(tie => 4 * tie).Concat(Enumerable.Range(own, 5)).ToArray();
        var generators = Enumerable.Range(0, 12).Select(g =>
            new Generator($"g{g}", g * 5 % own, 0, 90 + (15 * g), g % 3 == 0 ? 0 : 0.01 + (0.004 * g), 15 + (g * 7 % 31))).ToArray();
        var weights = copyNodes.Select(_ => 2e5).ToArray();
        var problem = new AreaAngleProblem(new AreaModel(own, generators, lines, copyNodes, weights, 5000));
        var loads = Enumerable.Range(0, own).Select(bus => 25.0 + (bus * 11 % 40)).ToArray();
        double[] anchors = new double[copyNodes.Length], copies = new double[copyNodes.Length], outputs = new double[generators.Length];
        return k =>
        {
            for (var c = 0; c < anchors.Length; c++)
                anchors[c] = 0.02 * Math.Sin((0.02 * k) + c);
            if (cold)
                problem.Forget();
            problem.Solve(loads, anchors, copies, outputs);
            return outputs[0];
        };
    }
}
