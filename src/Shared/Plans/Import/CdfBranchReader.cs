using System.Globalization;
using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>
/// Reads the branch section (columns from memory): buses 1–4 and 6–9, type 19, R 20–29, X 30–40, rating 51–55, ratio
/// 77–82, shift 84–90.
/// </summary>
internal static class CdfBranchReader
{
    private readonly record struct Branch(
        double Tap, double Other, double Type, double Resistance, double Reactance, double Rating, double Ratio, double Shift)
    {
        public bool IsTransformer => Type is 1 or 2 or 3 || Ratio is not (0 or 1);

        public bool Shifts => Type == 4 || Shift != 0;
    }

    private const string UnreadableRule =
        "cannot be read: a branch is two bus numbers, area, zone, circuit, type, R, X, B and three ratings";

    /// <summary>What the DC model leaves out, counted for the warnings.</summary>
    private sealed class Tally
    {
        public int Unrated { get; set; }

        public int Transformers { get; set; }

        public int Shifters { get; set; }
    }

    public static void Read(string[] lines, CdfSections sections, FileProblems problems, GridDraft draft)
    {
        var tally = new Tally();
        var named = new Dictionary<(int, int), int>();
        var (start, count) = sections.Branches.GetOffsetAndLength(lines.Length);
        for (var i = start; i < start + count; i++)
        {
            if (problems.IsFull)
            {
                problems.StoppedAt(i + 1);
                return;
            }

            if (draft.Lines.Count == PlanFileRules.MaxLines)
            {
                problems.Add(i + 1, null, null, null, "is one branch too many: at most 500,000 are read");
                return;
            }

            if (!string.IsNullOrWhiteSpace(lines[i]))
                ReadRow(CdfRow.Of(lines[i], i + 1), problems, draft, tally, named);
        }

        Warn(problems, draft, tally);
    }

    private static void ReadRow(CdfRow row, FileProblems problems, GridDraft draft, Tally tally, Dictionary<(int, int), int> named)
    {
        if ((ByColumn(row, draft) ?? ByOrder(row)) is not { } branch)
        {
            problems.Add(row.Line, 1, null, null, UnreadableRule);
            return;
        }

        var from = BusOf(branch.Tap, row.Line, 1, problems, draft);
        var to = BusOf(branch.Other, row.Line, 6, problems, draft);
        if (from is not { } a || to is not { } b)
            return;
        if (a == b)
            problems.Add(row.Line, 6, "second bus", draft.Buses[b].Name, "must not be the bus that the branch starts from");
        else if (GridRules.BrokenReactance(branch.Reactance) is { } broken)
            problems.Add(row.Line, 30, "reactance", Quantity.Number(branch.Reactance), broken);
        else if (GridRules.Resistance.Broken(branch.Resistance) is { } resistance)
            problems.Add(row.Line, 20, "resistance", Quantity.Number(branch.Resistance), resistance);
        else if (branch.Rating < 0 || branch.Rating > GridRules.Limit.Most)
            problems.Add(row.Line, 51, "rating", Quantity.Number(branch.Rating), "must not be negative, nor above 10,000,000");
        else
            draft.Lines.Add(Take(branch, a, b, draft, tally, named));
    }

    private static Line Take(Branch branch, int from, int to, GridDraft draft, Tally tally, Dictionary<(int, int), int> named)
    {
        tally.Unrated += branch.Rating == 0 ? 1 : 0;
        tally.Transformers += branch.IsTransformer ? 1 : 0;
        tally.Shifters += branch.Shifts ? 1 : 0;
        var circuit = named[(from, to)] = named.GetValueOrDefault((from, to)) + 1;
        var name = $"{draft.Buses[from].Name}-{draft.Buses[to].Name}";
        if (circuit > 1)
            name += string.Create(CultureInfo.InvariantCulture, $"-{circuit}");
        var limitMw = branch.Rating == 0 ? double.PositiveInfinity : branch.Rating;
        return new Line(name, from, to, branch.Reactance, limitMw, branch.Resistance);
    }

    private static void Warn(FileProblems problems, GridDraft draft, Tally tally)
    {
        var (all, rated) = (draft.Lines.Count, draft.Lines.Count - tally.Unrated);
        if (tally.Unrated > 0)
        {
            var given = $"{tally.Unrated} of {all}";
            Say($"gives no rating for {given} branches (0 means not given): they are left without a limit: fill in limit_mw where there is one");
        }

        if (rated > 0)
            Say($"rates {rated} branches in MVA: taken as limits in MW");
        if (tally.Transformers > 0)
            Say($"has {tally.Transformers} transformers: the DC model ignores their tap ratios");
        if (tally.Shifters > 0)
            Say($"has {tally.Shifters} phase shifters: their shift is ignored, so real flows will differ");

        void Say(FormattableString message) => problems.Warn(null, message.ToString(CultureInfo.InvariantCulture));
    }

    private static int? BusOf(double number, int line, int column, FileProblems problems, GridDraft draft)
    {
        var name = number.ToString("0", CultureInfo.InvariantCulture);
        if (draft.BusAt.TryGetValue(name, out var found))
            return found.Index;
        problems.Add(line, column, "bus", name, "must be a bus of the bus section");
        return null;
    }

    /// <summary>By column, if that gives two known buses: a number that lost a digit to drift would most likely be unknown.</summary>
    private static Branch? ByColumn(CdfRow row, GridDraft draft)
    {
        var branch = new Branch(
            row.Number(1, 4), row.Number(6, 9), row.Number(19, 19), row.Number(20, 29), row.Number(30, 40),
            row.Number(51, 55), row.Number(77, 82), row.Number(84, 90));
        return IsKnown(branch.Tap) && IsKnown(branch.Other) && IsSound(branch) ? branch : null;

        bool IsKnown(double number) => draft.BusAt.ContainsKey(number.ToString("0", CultureInfo.InvariantCulture));
    }

    private static Branch? ByOrder(CdfRow row)
    {
        var values = row.Values(1);
        if (values.Length < 8)
            return null;
        var branch = new Branch(values[0], values[1], values[5], values[6], values[7], At(9), At(14), At(15));
        return IsSound(branch) ? branch : null;

        double At(int index) => index < values.Length ? values[index] : 0;
    }

    private static bool IsSound(Branch branch) =>
        branch.Tap >= 0 && branch.Other >= 0 && branch.Type is 0 or 1 or 2 or 3 or 4
        && double.IsFinite(branch.Resistance) && double.IsFinite(branch.Reactance)
        && double.IsFinite(branch.Rating) && double.IsFinite(branch.Ratio) && double.IsFinite(branch.Shift);
}
