using Halfvoice.Optimization;

namespace Halfvoice.Tests.Optimization;

/// <summary>One problem of a site of several buses, a function of its seed alone.</summary>
internal sealed record AreaInstance(AreaModel Model, double[] LoadMw, double[] AnchorRad)
{
    public static AreaInstance From(int seed, int busesMost = 8)
    {
        var random = new Random(seed);
        var slack = random.Next(3) == 0 ? 1 : 15;
        var own = random.Next(1, busesMost + 1);
        var foreign = random.Next(5) == 0 ? 0 : random.Next(1, 5);
        var lines = new List<AreaLine>();
        for (var bus = 1; bus < own; bus++)
            lines.Add(Line(random, slack, bus, random.Next(bus)));
        for (var extra = random.Next(own); own > 1 && extra > 0; extra--)
        {
            var from = random.Next(own);
            lines.Add(Line(random, slack, from, (from + random.Next(1, own)) % own));
        }

        for (var node = own; node < own + foreign; node++)
        {
            for (var ties = random.Next(1, 3); ties > 0; ties--)
                lines.Add(Line(random, slack, random.Next(own), node));
        }

        var border = lines.Where(line => line.From >= own || line.To >= own).Select(line => Math.Min(line.From, line.To));
        var copies = border.Distinct().Concat(Enumerable.Range(own, foreign)).ToArray();
        var weights = copies.Select(_ => SiteInstances.LogUniform(random, 1e3, 1e7)).ToArray();
        var generators = random.Next(12) == 0 ? [] : SiteInstances.Generators(random, 3 + (2 * own), own);
        var model = new AreaModel(own, generators, lines, copies, weights, SiteInstances.UnservedPrice);
        var loads = Enumerable.Range(0, own).Select(_ => 250 * (random.NextDouble() - 0.2)).ToArray();
        return new AreaInstance(model, loads, copies.Select(_ => 0.4 * (random.NextDouble() - 0.5)).ToArray());
    }

    /// <summary>The same one-bus problem in the words of a site of several buses.</summary>
    public static AreaInstance From(NodalInstance nodal)
    {
        var lines = nodal.Lines.Select(line => new AreaLine(0, line.Copy, line.SusceptanceMwPerRad, line.LimitMw)).ToArray();
        var copies = Enumerable.Range(0, nodal.Weights.Length).ToArray();
        var model = new AreaModel(1, nodal.Generators, lines, copies, nodal.Weights, SiteInstances.UnservedPrice);
        return new AreaInstance(model, [nodal.LoadMw], nodal.AnchorRad);
    }

    private static AreaLine Line(Random random, double slack, int from, int to)
    {
        var limit = SiteInstances.Limit(random);
        return new AreaLine(from, to, SiteInstances.Susceptance(random), limit == 0 && random.Next(4) > 0 ? 60 : slack * limit);
    }
}

/// <summary>What an area problem answered.</summary>
internal sealed record AreaAnswer(
    AreaAngleSolution Solution, double[] CopiesRad, double[] OutputMw, double[] PricePerMwh, double[] UnservedMw)
{
    public static AreaAnswer Of(AreaAngleProblem problem, AreaInstance instance)
    {
        var copies = new double[instance.AnchorRad.Length];
        var outputs = new double[instance.Model.Generators.Count];
        var solution = problem.Solve(instance.LoadMw, instance.AnchorRad, copies, outputs);
        return new AreaAnswer(solution, copies, outputs, problem.PricePerMwh.ToArray(), problem.UnservedMw.ToArray());
    }

    /// <summary>Objective without the generators' fixed costs, $/h.</summary>
    public double CostPerHour(AreaInstance instance)
    {
        var model = instance.Model;
        var cost = model.Generators.Select((g, i) => g.CostPerHour(OutputMw[i]) - g.CostFixed).Sum();
        cost += model.CopyWeights.Select((w, c) => 0.5 * w * Math.Pow(CopiesRad[c] - instance.AnchorRad[c], 2)).Sum();
        return cost + (model.UnservedPricePerMwh * (Solution.ShedMw + Solution.SpiltMw));
    }
}
