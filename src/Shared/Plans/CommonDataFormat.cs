using System.Globalization;
using System.Text;
using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>How an import divides the buses among sites.</summary>
public enum ImportSites
{
    /// <summary>Each bus is a site of its own, called <c>bus-N</c>.</summary>
    Bus,

    /// <summary>Each area of the file is a site, called <c>area-N</c>.</summary>
    Area,
}

/// <summary>What an import needs beside the file.</summary>
public sealed record CommonDataFormatOptions
{
    /// <summary>The file's name, for messages.</summary>
    public string FileName { get; init; } = "case.cdf";

    public ImportSites SitesBy { get; init; } = ImportSites.Bus;

    /// <summary>
    /// The plants, in the form of a plan's generators.csv with bus numbers as bus names: the format knows neither limits
    /// nor costs. Without it placeholders stand in, and a warning says so.
    /// </summary>
    public byte[]? Generators { get; init; }

    /// <summary>Name of the generators file, for messages.</summary>
    public string GeneratorsName { get; init; } = "generators.csv";
}

/// <summary>
/// Turns a solved case in the IEEE Common Data Format (IEEE Transactions on Power Apparatus and Systems, 1973, pages
/// 1916 to 1925) into a plan. Bus columns are those of that paper; branch columns and some meanings are from memory.
/// Real files drift from the columns, so where a value straddles them its row is read by the order of its values.
/// </summary>
/// <remarks>
/// Placeholders for plants, typical and unverified: a bus with generation P &gt; 0 gets a plant with 0 to 2·P MW and a
/// marginal cost that rises from 20 to 40 $/MWh; one with P &lt; 0 a plant with 2·P to 0 MW and the same costs.
/// </remarks>
public static class CommonDataFormat
{
    private const double UsualBaseMva = 100;

    /// <summary>Never throws for what a file holds; errors name line and column (the character) of the file.</summary>
    public static PlanReading Read(byte[] bytes, CommonDataFormatOptions? options = null)
    {
        options ??= new CommonDataFormatOptions();
        var problems = new PlanProblems();
        var inFile = problems.In(options.FileName);
        if (Lines(bytes, inFile) is not { } lines)
            return problems.ToReading(null);
        var sections = CdfSections.Find(lines, inFile);
        if (sections is null)
            return problems.ToReading(null);
        var draft = new GridDraft { BusSource = options.FileName };
        var buses = CdfBusReader.Read(lines, sections, options.SitesBy, inFile, draft);
        CdfBranchReader.Read(lines, sections, inFile, draft);
        Plants(options, problems, buses, draft);
        if (problems.Count > 0)
            return problems.ToReading(null);
        var plan = Assemble(lines[0], options, buses, draft, inFile);
        PlanChecks.Run(plan, problems, options.FileName);
        return problems.ToReading(plan);
    }

    private static string[]? Lines(byte[] bytes, FileProblems problems)
    {
        if (bytes.Length > PlanFileRules.MaxCsvBytes)
        {
            problems.Whole(PlanFileRules.TooLarge(bytes.Length, PlanFileRules.MaxCsvBytes));
            return null;
        }

        if (bytes.AsSpan().Contains((byte)0))
        {
            problems.Whole("is not a text file: it holds zero bytes");
            return null;
        }

        // The format is older than UTF-8 and fixes columns by byte; Latin-1 keeps a byte a column whatever it means.
        return Encoding.Latin1.GetString(bytes).ReplaceLineEndings("\n").Split('\n');
    }

    private static void Plants(CommonDataFormatOptions options, PlanProblems problems, List<CdfBus> buses, GridDraft draft)
    {
        if (options.Generators is { } bytes)
        {
            var files = new MemoryPlanFiles([KeyValuePair.Create(options.GeneratorsName, bytes)]);
            GridReader.ReadGenerators(files, problems.In(options.GeneratorsName), draft);
            return;
        }

        for (var i = 0; i < buses.Count; i++)
        {
            var generation = buses[i].GenerationMw;
            if (generation == 0)
                continue;
            var (min, max) = (Math.Min(0, 2 * generation), Math.Max(0, 2 * generation));
            draft.Generators.Add(new Generator("G" + buses[i].Number, i, min, max, 10 / (max - min), 20));
        }

        problems.Warn(options.FileName, null, string.Create(
            CultureInfo.InvariantCulture,
            $"has no costs or limits of plants: {draft.Generators.Count} plants got placeholders (typical, unverified: replace them): "
            + $"up to twice the solved generation, 20 to 40 $/MWh"));
    }

    private static Plan Assemble(string title, CommonDataFormatOptions options, List<CdfBus> buses, GridDraft draft, FileProblems problems)
    {
        var network = new Network(BaseMva(title, problems), draft.Buses, draft.Lines, draft.Generators);
        var name = title.Length > 45 ? title[45..].Trim() : "";
        return new Plan
        {
            Name = name.Length is 0 or > 200 || name.Any(char.IsControl) ? "Imported from " + options.FileName : name,
            Network = network,
            Loads = network.Sites.ToDictionary(
                site => site,
                site => new LoadSeries([], [[.. network.BusesOf(site).Select(bus => buses[bus].LoadMw)]]),
                StringComparer.Ordinal),
        };
    }

    /// <summary>Columns 32 to 37 of the title; where these hold no number, the number before the year.</summary>
    private static double BaseMva(string title, FileProblems problems)
    {
        if (CdfRow.Of(title, 1).Number(32, 37) is > 0 and <= 1e6 and var mva)
            return mva;
        var words = title.Split(' ', StringSplitOptions.RemoveEmptyEntries);
        for (var i = 1; i < words.Length; i++)
        {
            if (words[i] is ['1' or '2', _, _, _] && int.TryParse(words[i], NumberStyles.None, CultureInfo.InvariantCulture, out _)
                && Quantity.TryNumber(words[i - 1], out var value) && value is > 0 and <= 1e6)
                return value;
        }

        problems.Warn(1, "gives no power base in columns 32 to 37: 100 MVA are assumed; flows do not depend on it, angles do");
        return UsualBaseMva;
    }
}
