using System.Text.RegularExpressions;

namespace Halfvoice.Tests.Conventions;

/// <summary>What every written file keeps to. Each rule takes a file and gives what is wrong with it, one line each.</summary>
internal static class Rules
{
    public const int MostLinesOfFunction = 70;
    public const int MostLinesOfFile = 400;
    public const int MostColumns = 160;

    // The words are put together here so that this file does not hold them itself.
    private static readonly string[] Unfinished = ["NotImplemented" + "Exception", "TO" + "DO", "FIX" + "ME", "HA" + "CK"];
    private static readonly string[] Sleeping = ["Thread." + "Sleep", "Task." + "Delay"];

    private static readonly string Rooted = "/(" + string.Join('|', "root", "home", "work", "tmp", "Users", "mnt") + ")/";
    private static readonly Regex MachinePath = new($@"(?<![\w.~/]){Rooted}|file://{Rooted}|[A-Za-z]:\\+(" + @"Users|Windows)\b");

    private static readonly string[] Registries =
    [
        "nuget" + ".org", "npmjs" + ".", "pypi" + ".org", "pythonhosted" + ".org", "crates" + ".io", "docker" + ".io", "docker" + ".com",
        "mcr.micro" + "soft", "ghcr" + ".io", "quay" + ".io", "gcr" + ".io", "golang" + ".org", "archive.ubu" + "ntu", "deb.deb" + "ian",
    ];

    public static IEnumerable<string> LongFunctions(SourceFile file) => CodeOutline.Of(file.Text).Members
        .Where(member => member.Lines > MostLinesOfFunction)
        .Select(member => $"{file.Path}:{member.Line}: {member.Head} takes {member.Lines} lines, at most {MostLinesOfFunction}");

    public static IEnumerable<string> LongFile(SourceFile file) => file.Lines().Length is var lines and > MostLinesOfFile
        ? [$"{file.Path} has {lines} lines, at most {MostLinesOfFile}"]
        : [];

    public static IEnumerable<string> WideLines(SourceFile file) => file.Lines().Index()
        .Where(line => line.Item.TrimEnd('\r').Length > MostColumns)
        .Select(line => $"{file.Path}:{line.Index + 1}: {line.Item.Length} columns, at most {MostColumns}");

    public static IEnumerable<string> UnfinishedWork(SourceFile file) => Words(file, Unfinished, "unfinished work");

    /// <summary>A test that sleeps is slow when it passes and wrong when the machine is busy.</summary>
    public static IEnumerable<string> Sleeps(SourceFile file) =>
        file.IsTest && !file.IsBenchmark ? Words(file, Sleeping, "a sleep in a test; wait on a signal") : [];

    public static IEnumerable<string> MachinePaths(SourceFile file) => file.Lines().Index()
        .Where(line => MachinePath.IsMatch(line.Item))
        .Select(line => $"{file.Path}:{line.Index + 1}: a path of one machine: {line.Item.Trim()}");

    public static IEnumerable<string> RegistryHosts(SourceFile file) => file.Lines().Index()
        .Where(line => Registries.Any(host => line.Item.Contains(host, StringComparison.OrdinalIgnoreCase)))
        .Select(line => $"{file.Path}:{line.Index + 1}: names a package registry: {line.Item.Trim()}");

    /// <summary>
    /// A file of the product holds one class; small records, enums and interfaces that belong to it or form a family of
    /// messages may lie beside it.
    /// </summary>
    public static IEnumerable<string> SeveralClasses(SourceFile file)
    {
        var classes = CodeOutline.Of(file.Text).TopTypes.Where(head => Regex.IsMatch(head, @"\bclass\s") && !head.Contains("record ")).ToArray();
        var plain = classes.Where(head => !head.Contains("JsonSerializerContext", StringComparison.Ordinal)).ToArray();
        return !file.IsTest && plain.Length > 1 ? [$"{file.Path} holds {plain.Length} classes: {string.Join("; ", plain)}"] : [];
    }

    private static IEnumerable<string> Words(SourceFile file, string[] words, string what) => file.Lines().Index()
        .Where(line => words.Any(word => Regex.IsMatch(line.Item, $@"\b{Regex.Escape(word)}\b")))
        .Select(line => $"{file.Path}:{line.Index + 1}: {what}: {line.Item.Trim()}");
}
