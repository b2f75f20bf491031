using System.Globalization;
using Halfvoice.Rehearsal;
using Spectre.Console;

namespace Halfvoice.Rig.Terminal;

/// <summary>A verdict for people: one table of cycles, one of limits, and a last line.</summary>
public static class VerdictTables
{
    public static void Show(Screen screen, Verdict verdict, string folder)
    {
        screen.Show(Cycles(verdict));
        screen.Show(Limits(verdict));
        foreach (var note in verdict.Notes)
            screen.Text.WriteLine($"  note: {note}");
        screen.Text.WriteLine();
        screen.Text.WriteLine(verdict.Passed ? "PASSED: every limit was met." : "FAILED: at least one limit was missed.");
        screen.Text.WriteLine($"run folder: {folder}");
        var seed = verdict.Seed?.ToString(CultureInfo.InvariantCulture) ?? "none (real noise, no faults)";
        var options = string.Join(", ", verdict.Options.Select(o => $"{o.Key}={o.Value}"));
        screen.Text.WriteLine($"commit {verdict.Commit}, seed {seed}, options {options}");
    }

    private static Table Cycles(Verdict verdict)
    {
        var table = Screen.NewTable($"{verdict.Plan}: cycles");
        foreach (var (name, right) in new[] { ("cycle", true), ("end", false), ("rounds", true), ("seconds", true),
            ("optimum $/h", true), ("delivered $/h", true),
            ("cost gap %", true), ("reserve MW", true), ("worst line", false), ("loading %", true), ("kB", true), ("largest ε", true) })
        {
            table.AddColumn(right ? new TableColumn(name).RightAligned() : new TableColumn(name));
        }

        foreach (var c in verdict.Cycles)
        {
            table.AddRow(Text(c.Cycle, "0"), Markup.Escape(c.Settled ? "settled" : $"not settled: {c.End}"), Text(c.Rounds, "0"), Text(c.Seconds, "0.00"),
                Text(c.OptimumPerHour, "0.00"), Text(c.CostPerHour, "0.00"), Text(100 * c.CostGap, "0.000"), Text(c.ReserveMw, "0.00"),
                Markup.Escape(c.WorstLine ?? "-"), Text(100 * c.WorstLoading, "0.0"), Text(c.Bytes / 1000.0, "0.0"),
                c.EpsilonBySite.Count == 0 ? "no guarantee" : Text(c.EpsilonBySite.Values.Max(), "0.###"));
        }

        return table;
    }

    private static Table Limits(Verdict verdict)
    {
        var table = Screen.NewTable("Limits");
        table.AddColumn("limit").AddColumn(new TableColumn("measured").RightAligned()).AddColumn(new TableColumn("at most").RightAligned())
            .AddColumn("unit").AddColumn("result");
        foreach (var limit in verdict.Limits)
        {
            var percent = limit.Unit == "fraction";
            var format = percent ? "0.###" : "0.##";
            table.AddRow(Markup.Escape(limit.Name), Text(percent ? 100 * limit.Measured : limit.Measured, format, "not reached"),
                Text(percent ? 100 * limit.Limit : limit.Limit, format), percent ? "%" : limit.Unit, limit.Passed ? "pass" : "FAIL");
        }

        return table;
    }

    private static string Text(double? value, string format, string none = "-") => value?.ToString(format, CultureInfo.InvariantCulture) ?? none;
}
