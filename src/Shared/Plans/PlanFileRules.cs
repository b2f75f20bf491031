using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>How large the files of a plan folder may be, and how many rows they may have.</summary>
public static class PlanFileRules
{
    public const string Yaml = "plan.yaml";
    public const string Buses = "grid/buses.csv";
    public const string Lines = "grid/lines.csv";
    public const string Generators = "grid/generators.csv";
    public const string LoadFolder = "loads/";

    /// <summary>1 MiB: a plan.yaml with links for 5,000 sites takes about a third of it.</summary>
    public const int MaxYamlBytes = 1 << 20;

    /// <summary>64 MiB for any of the CSV files; bounds the memory that a wrong file can take.</summary>
    public const int MaxCsvBytes = 64 << 20;

    public const int MaxBuses = 200_000;
    public const int MaxLines = 500_000;
    public const int MaxGenerators = 500_000;

    /// <summary>Rows of one load file: a bus a row, or a bus and a time.</summary>
    public const int MaxLoadRows = 1_000_000;

    /// <summary>After this many errors the rest of a file is not read.</summary>
    public const int MaxErrorsPerFile = 200;

    /// <summary>After this many errors in all, the files that follow are not read.</summary>
    public const int MaxErrors = 20_000;

    /// <summary>Rule text for a file above its cap.</summary>
    public static string TooLarge(long bytes, int maxBytes) => string.Create(
        CultureInfo.InvariantCulture,
        $"is {bytes / 1048576.0:0.0} MiB large; at most {maxBytes / 1048576.0:0.#} MiB are read");

    /// <summary>Name of a site's load file.</summary>
    public static string LoadFile(string site) => LoadFolder + site + ".csv";
}
