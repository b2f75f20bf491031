using System.CommandLine;
using Halfvoice.Plans;
using Halfvoice.Rig.Terminal;

namespace Halfvoice.Rig.Commands;

/// <summary><c>new FOLDER</c>: a plan folder, invented from a seed or imported from a solved case.</summary>
internal static class NewCommand
{
    public static Command Create()
    {
        var folder = new Argument<string>("FOLDER") { Description = "The plan folder to make; must be new or empty." };
        var sites = new Option<int?>("--sites") { Description = "Invent a region of this many sites, 3 to 5000." };
        var seed = new Option<long>("--seed") { Description = "The same seed invents the same region.", DefaultValueFactory = _ => 1 };
        var buses = new Option<int>("--buses-per-site") { Description = "About this many buses a site, 1 to 20.", DefaultValueFactory = _ => 1 };
        var cdf = new Option<FileInfo?>("--from-cdf") { Description = "Import a solved case in the IEEE Common Data Format instead of inventing." };
        var costs = new Option<FileInfo?>("--costs")
        {
            Description = "With --from-cdf: the plants, as a generators.csv with bus numbers as buses; without it placeholders are used.",
        };
        var sitesBy = new Option<ImportSites>("--sites-by")
        {
            Description = "With --from-cdf: one site a bus, or one an area of the file.",
            DefaultValueFactory = _ => ImportSites.Bus,
        };
        var command = new Command("new", "Make a plan folder: an invented region of any size, or an imported case.")
        {
            folder, sites, seed, buses, cdf, costs, sitesBy,
        };
        command.SetAction(parse =>
        {
            var target = parse.GetRequiredValue(folder);
            var screen = new Screen(false);
            RefuseFilled(target);
            var plan = parse.GetValue(cdf) is { } file
                ? Import(file, parse.GetValue(costs), parse.GetValue(sitesBy), parse.GetValue(sites), screen)
                : Invent(parse.GetValue(sites), parse.GetValue(seed), parse.GetValue(buses), parse.GetValue(costs));
            var comment = parse.GetValue(cdf) is null
                ? $"An invented region: no bus, line, plant, load or cost here belongs to a real one. "
                    + $"Made with --sites {parse.GetValue(sites)} --seed {parse.GetValue(seed)} --buses-per-site {parse.GetValue(buses)}."
                : $"Imported from {parse.GetValue(cdf)!.Name} (IEEE Common Data Format).";
            Write(plan, target, comment);
            var network = plan.Network;
            screen.Text.WriteLine($"{plan.Name}: {network.Sites.Count} sites, {network.Buses.Count} buses, {network.Lines.Count} lines, "
                + $"{network.Generators.Count} generators in {target}");
            return ExitCodes.Passed;
        });
        return command;
    }

    private static Plan Invent(int? sites, long seed, int busesPerSite, FileInfo? costs)
    {
        if (sites is not { } count)
            throw new RigException(ExitCodes.PlanWrong, "Say --sites N to invent a region, or --from-cdf FILE to import one.");
        if (costs is not null)
            throw new RigException(ExitCodes.PlanWrong, "--costs goes with --from-cdf.");
        if (count is < 3 or > 5000)
            throw new RigException(ExitCodes.PlanWrong, $"--sites must be 3 to 5000; it is {count}.");
        if (busesPerSite is < 1 or > 20)
            throw new RigException(ExitCodes.PlanWrong, $"--buses-per-site must be 1 to 20; it is {busesPerSite}.");
        return InventedPlans.Make(count, seed, busesPerSite);
    }

    private static Plan Import(FileInfo file, FileInfo? costs, ImportSites sitesBy, int? sites, Screen screen)
    {
        if (sites is not null)
            throw new RigException(ExitCodes.PlanWrong, "--sites invents a region and --from-cdf imports one: give one of them.");
        var reading = CommonDataFormat.Read(Bytes(file), new CommonDataFormatOptions
        {
            FileName = file.Name,
            SitesBy = sitesBy,
            Generators = costs is null ? null : Bytes(costs),
            GeneratorsName = costs?.Name ?? "generators.csv",
        });
        foreach (var warning in reading.Warnings)
            screen.Text.WriteLine($"warning: {warning.Text}");
        return reading.Plan ?? throw new RigException(ExitCodes.PlanWrong, string.Join(Environment.NewLine, reading.ErrorLines()));
    }

    private static byte[] Bytes(FileInfo file)
    {
        const long most = 256L << 20;
        if (!file.Exists)
            throw new RigException(ExitCodes.PlanWrong, $"{file.Name}: there is no such file.");
        if (file.Length > most)
            throw new RigException(ExitCodes.PlanWrong, $"{file.Name}: is larger than {most >> 20} MB, and no such case is.");
        return File.ReadAllBytes(file.FullName);
    }

    private static void RefuseFilled(string folder)
    {
        if (File.Exists(folder) || (Directory.Exists(folder) && Directory.EnumerateFileSystemEntries(folder).Any()))
            throw new RigException(ExitCodes.PlanWrong, $"{folder} is not empty. A new plan never overwrites: give a new folder.");
    }

    private static void Write(Plan plan, string folder, string comment)
    {
        foreach (var (name, text) in PlanWriter.Write(plan, comment))
        {
            var path = Path.Combine(folder, name);
            Directory.CreateDirectory(Path.GetDirectoryName(path)!);
            File.WriteAllText(path, text);
        }
    }
}
