using System.CommandLine;
using System.Globalization;
using System.Text.Json;
using Halfvoice.Plans;
using Halfvoice.Rehearsal;
using Halfvoice.Rig.PlanFiles;
using Halfvoice.Rig.Runs;
using Halfvoice.Rig.Terminal;
using Spectre.Console;

namespace Halfvoice.Rig.Commands;

/// <summary><c>check PLAN</c>: reads and validates a plan and says what its rehearsal would do.</summary>
internal static class CheckCommand
{
    public static Command Create()
    {
        var plan = CommonArguments.Plan();
        var json = CommonArguments.Json();
        var command = new Command("check", "Validate a plan and say what its rehearsal would do.") { plan, json };
        command.SetAction(parse => Run(parse.GetRequiredValue(plan), new Screen(parse.GetValue(json))));
        return command;
    }

    private static int Run(string planFolder, Screen screen)
    {
        var (plan, read) = PlanLoader.Load(planFolder);
        var preview = PlanPreview.Of(plan);
        var warnings = read.Select(warning => warning.Text).Concat(preview.Warnings(plan)).ToArray();
        if (screen.Json)
            Console.Out.WriteLine(ToJson(plan, preview, warnings));
        else
            Show(screen, plan, preview, warnings);
        return ExitCodes.Passed;
    }

    private static void Show(Screen screen, Plan plan, PlanPreview preview, IReadOnlyList<string> warnings)
    {
        var table = Screen.NewTable($"{plan.Name}: what a rehearsal would do").AddColumn("what").AddColumn("value");
        table.HideHeaders();
        foreach (var (what, value) in Rows(plan, preview))
            table.AddRow(Markup.Escape(what), Markup.Escape(value));
        screen.Show(table);
        foreach (var (sites, derivation) in preview.Privacy)
        {
            var more = sites.Count > 8 ? $" and {sites.Count - 8} more" : string.Empty;
            screen.Text.WriteLine($"privacy of {string.Join(", ", sites.Take(8))}{more}: {derivation.Words}");
        }

        screen.Text.WriteLine();
        foreach (var warning in warnings)
            screen.Text.WriteLine($"warning: {warning}");
        var count = $"{warnings.Count} warning{(warnings.Count == 1 ? string.Empty : "s")}";
        screen.Text.WriteLine(warnings.Count == 0 ? "The plan is sound; nothing to warn of." : $"The plan can be rehearsed; {count}.");
    }

    private static IEnumerable<(string What, string Value)> Rows(Plan plan, PlanPreview preview)
    {
        var network = plan.Network;
        var loads = preview.Optima.Select((_, c) => plan.LoadMw(c + 1).Sum()).ToArray();
        var (score, measure, link) = (preview.TrialScore, preview.TrialMeasure, preview.SlowestLink);
        yield return ("sites, buses, lines, generators",
            Text($"{network.Sites.Count}, {network.Buses.Count}, {network.Lines.Count}, {network.Generators.Count}"));
        yield return ("load", Text($"{loads.Min():0.0} to {loads.Max():0.0} MW over the cycles; capacity {network.Generators.Sum(g => g.MaxMw):0.0} MW"));
        var penalty = plan.Scheme.PenaltyFactor == 1 ? "automatic" : Text($"{plan.Scheme.PenaltyFactor:0.###} times the automatic one");
        yield return ("scheme", Text($"{PlanKeys.NameOf(plan.Scheme.Kind)}; price scale {preview.PriceScalePerMwh:0.##} $/MWh, penalty {penalty}"));
        var fraction = Text($"({100 * plan.Stop.MismatchFraction:0.##} % of {preview.ReferenceLoadMw:0} MW)");
        var price = Text($"price move at most {plan.Stop.PriceMovePerMwh:0.###} $/MWh, or what noise leaves");
        yield return ("settled when", Text($"mismatch at most {preview.MismatchLimitMw:0.00} MW {fraction} and {price}"));
        yield return ("rounds expected", Text($"{preview.TrialRounds} (trial of cycle 1 in this process, {preview.TrialEnd}); cap {plan.Stop.RoundCap}"));
        var loading = Text($"worst loading {100 * score.WorstLoading:0.0} %");
        yield return ("trial's score", Text($"cost gap {100 * score.CostGap:0.000} %, reserve {score.ReserveMw:0.00} MW, {loading}"));
        var priceFloor = Text($"price move {measure.PriceFloorPerMwh:0.000} $/MWh at the round cap");
        yield return ("noise floor", Text($"mismatch {measure.MismatchFloorMw:0.00} MW, {priceFloor}"));
        yield return ("bytes a round", Text($"{preview.BytesPerRound:0} for all sites, both directions"));
        var trip = Text($"round trip {link.RoundTrip.TotalMilliseconds:0} ms, jitter {link.Jitter.TotalMilliseconds:0} ms");
        yield return ("slowest link", Text($"{preview.SlowestSite}: {trip}; {preview.TrialRounds} rounds take {preview.LinkSeconds:0.0} s or more"));
        yield return ("limit to settle", Text($"{AcceptanceJudge.SettleWithinSeconds(plan):0.#} s of an interval of {plan.Interval.TotalSeconds:0} s"));
        yield return ("privacy", RunNotes.PrivacyNote(plan));
        var (cost, prices) = (preview.Optima[0].CostPerHour, preview.Optima[0].PricePerMwh);
        yield return ("central optimum", Text($"{cost:0.00} $/h in cycle 1; prices {prices.Min():0.00} to {prices.Max():0.00} $/MWh"));
    }

    private static string ToJson(Plan plan, PlanPreview preview, IReadOnlyList<string> warnings)
    {
        using var buffer = new MemoryStream();
        using (var json = new Utf8JsonWriter(buffer, new JsonWriterOptions { Indented = true }))
        {
            json.WriteStartObject();
            json.WriteString("plan", plan.Name);
            json.WriteNumber("sites", plan.Network.Sites.Count);
            json.WriteNumber("buses", plan.Network.Buses.Count);
            json.WriteNumber("lines", plan.Network.Lines.Count);
            json.WriteNumber("generators", plan.Network.Generators.Count);
            json.WriteNumber("rounds_expected", preview.TrialRounds);
            json.WriteString("trial_end", preview.TrialEnd.ToString());
            json.WriteNumber("trial_cost_gap", preview.TrialScore.CostGap);
            json.WriteNumber("bytes_per_round", preview.BytesPerRound);
            json.WriteString("slowest_site", preview.SlowestSite);
            json.WriteNumber("slowest_round_trip_ms", preview.SlowestLink.RoundTrip.TotalMilliseconds);
            json.WriteString("mechanism", PlanKeys.NameOf(plan.Privacy.Mechanism));
            json.WriteStartArray("privacy");
            foreach (var (sites, derivation) in preview.Privacy)
            {
                json.WriteStartObject();
                json.WriteStartArray("sites");
                foreach (var site in sites)
                    json.WriteStringValue(site);
                json.WriteEndArray();
                json.WriteNumber("epsilon_per_answer", derivation.Allowance.EpsilonPerAnswer);
                json.WriteNumber("epsilon_per_cycle", derivation.Allowance.EpsilonPerCycle);
                json.WriteNumber("epsilon_per_day", derivation.DayTotal);
                json.WriteNumber("noise_scale", derivation.Calibration.Scale);
                json.WriteString("noise_unit", derivation.Unit);
                json.WriteEndObject();
            }

            json.WriteEndArray();
            json.WriteStartArray("optimum_per_hour");
            foreach (var optimum in preview.Optima)
                json.WriteNumberValue(optimum.CostPerHour);
            json.WriteEndArray();
            json.WriteStartArray("warnings");
            foreach (var warning in warnings)
                json.WriteStringValue(warning);
            json.WriteEndArray();
            json.WriteEndObject();
        }

        return System.Text.Encoding.UTF8.GetString(buffer.ToArray());
    }

    private static string Text(FormattableString text) => text.ToString(CultureInfo.InvariantCulture);
}
