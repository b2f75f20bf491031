using System.CommandLine;
using System.Diagnostics;
using System.Globalization;
using System.Text.Json;
using Halfvoice.Grid;
using Halfvoice.Optimization;
using Halfvoice.Rig.PlanFiles;
using Halfvoice.Rig.Terminal;
using Spectre.Console;

namespace Halfvoice.Rig.Commands;

/// <summary><c>optimum PLAN</c>: the central optimum, the yardstick of every rehearsal.</summary>
internal static class OptimumCommand
{
    private const double LoadedFraction = 0.9;

    public static Command Create()
    {
        var plan = CommonArguments.Plan();
        var json = CommonArguments.Json();
        var cycle = new Option<int>("--cycle") { Description = "Whose loads to take, counted from 1.", DefaultValueFactory = _ => 1 };
        var command = new Command("optimum", "Solve the whole dispatch centrally: cost, dispatch, prices, flows, loadings.") { plan, json, cycle };
        command.SetAction(parse => Run(parse.GetRequiredValue(plan), parse.GetValue(cycle), new Screen(parse.GetValue(json))));
        return command;
    }

    private static int Run(string planFolder, int cycle, Screen screen)
    {
        if (cycle < 1)
            throw new RigException(ExitCodes.PlanWrong, $"--cycle counts from 1; it is {cycle}.");
        var (plan, _) = PlanLoader.Load(planFolder);
        var load = plan.LoadMw(cycle);
        var clock = Stopwatch.StartNew();
        var optimum = CentralOptimum.Solve(plan.Network, load);
        var seconds = clock.Elapsed.TotalSeconds;
        if (screen.Json)
            Console.Out.WriteLine(ToJson(plan.Network, optimum, seconds));
        if (optimum.Status == OptimumStatus.Infeasible)
            throw new RigException(ExitCodes.PlanWrong,
                $"The loads of cycle {cycle} cannot be served by this grid. {optimum.Infeasibility?.Describe(plan.Network)}");
        if (optimum.Status != OptimumStatus.Optimal)
            throw new RigException(ExitCodes.Broke,
                $"No optimum was found after {optimum.Iterations} iterations; the numbers of the plan are too far apart in size.");
        if (!screen.Json)
            Show(screen, plan.Network, load, optimum, seconds);
        return ExitCodes.Passed;
    }

    private static void Show(Screen screen, Network network, double[] load, Optimum optimum, double seconds)
    {
        screen.Text.WriteLine(string.Create(CultureInfo.InvariantCulture,
            $"cost {optimum.CostPerHour:0.00} $/h for {load.Sum():0.0} MW of load, found in {1000 * seconds:0.0} ms and {optimum.Iterations} iterations"));
        var plants = Screen.NewTable("Dispatch").AddColumn("generator").AddColumn("bus").AddColumn(Right("MW")).AddColumn(Right("min")).AddColumn(Right("max"))
            .AddColumn(Right("price $/MWh"));
        for (var g = 0; g < network.Generators.Count; g++)
        {
            var generator = network.Generators[g];
            plants.AddRow(Markup.Escape(generator.Name), Markup.Escape(network.Buses[generator.Bus].Name), Text(optimum.DispatchMw[g]), Text(generator.MinMw),
                Text(generator.MaxMw), Text(optimum.PricePerMwh[generator.Bus]));
        }

        screen.Show(plants);
        var lines = Screen.NewTable("Lines at or above 90 % of their limit").AddColumn("line").AddColumn("from").AddColumn("to").AddColumn(Right("MW"))
            .AddColumn(Right("limit MW")).AddColumn(Right("loading %")).AddColumn(Right("worth $/MWh"));
        for (var l = 0; l < network.Lines.Count; l++)
        {
            var line = network.Lines[l];
            var loading = Math.Abs(optimum.FlowMw[l]) / line.LimitMw;
            if (loading < LoadedFraction)
                continue;
            lines.AddRow(Markup.Escape(line.Name), Markup.Escape(network.Buses[line.FromBus].Name), Markup.Escape(network.Buses[line.ToBus].Name),
                Text(optimum.FlowMw[l]), Text(line.LimitMw), Text(100 * loading), Text(optimum.LinePricePerMwh[l]));
        }

        screen.Show(lines);
    }

    private static TableColumn Right(string name) => new TableColumn(name).RightAligned();

    private static string Text(double value) => value.ToString("0.00", CultureInfo.InvariantCulture);

    private static string ToJson(Network network, Optimum optimum, double seconds)
    {
        using var buffer = new MemoryStream();
        using (var json = new Utf8JsonWriter(buffer, new JsonWriterOptions { Indented = true }))
        {
            var solved = optimum.Status == OptimumStatus.Optimal;
            json.WriteStartObject();
            json.WriteString("status", optimum.Status switch
            {
                OptimumStatus.Optimal => "optimal",
                OptimumStatus.Infeasible => "infeasible",
                _ => "not_converged",
            });
            if (solved)
                json.WriteNumber("cost_per_hour", optimum.CostPerHour);
            else
                json.WriteNull("cost_per_hour");
            Write(json, "dispatch_mw", network.Generators.Select(g => g.Name), optimum.DispatchMw, solved);
            Write(json, "price_per_mwh", network.Buses.Select(b => b.Name), optimum.PricePerMwh, solved);
            Write(json, "flow_mw", network.Lines.Select(l => l.Name), optimum.FlowMw, solved);
            if (optimum.Infeasibility is { } infeasible)
            {
                json.WriteNumber("unserved_mw", infeasible.UnservedMw);
                json.WriteString("explanation", infeasible.Describe(network));
            }

            json.WriteNumber("iterations", optimum.Iterations);
            json.WriteNumber("seconds", seconds);
            json.WriteEndObject();
        }

        return System.Text.Encoding.UTF8.GetString(buffer.ToArray());
    }

    private static void Write(Utf8JsonWriter json, string name, IEnumerable<string> names, double[] values, bool solved)
    {
        json.WriteStartObject(name);
        if (solved)
        {
            foreach (var (key, i) in names.Select((key, i) => (key, i)))
                json.WriteNumber(key, values[i]);
        }

        json.WriteEndObject();
    }
}
