using System.CommandLine;
using System.Globalization;
using System.Net;
using Halfvoice.Coordination;
using Halfvoice.Rig.Authority;
using Halfvoice.Rig.PlanFiles;
using Halfvoice.Rig.Runs;
using Halfvoice.Rig.Terminal;

namespace Halfvoice.Rig.Commands;

/// <summary><c>pack PLAN FOLDER</c>: the bundles that coordinator and agents are started with.</summary>
internal static class PackCommand
{
    public static Command Create()
    {
        var plan = CommonArguments.Plan();
        var folder = new Argument<string>("FOLDER") { Description = "Where to write coordinator/ and sites/SITE/; must be new or empty." };
        var coordinator = new Option<string>("--coordinator") { Description = "HOST:PORT under which sites will dial the coordinator.", Required = true };
        var days = new Option<int>("--days") { Description = "Days that the identities count, 1 to 3650.", DefaultValueFactory = _ => 30 };
        var command = new Command("pack", "Write the bundles of a plan, with identities of a new lab authority.") { plan, folder, coordinator, days };
        command.SetAction(parse => Run(
            parse.GetRequiredValue(plan), parse.GetRequiredValue(folder), parse.GetRequiredValue(coordinator), parse.GetValue(days), new Screen(false)));
        return command;
    }

    private static int Run(string planFolder, string folder, string coordinator, int days, Screen screen)
    {
        var colon = coordinator.LastIndexOf(':');
        var host = colon < 1 ? string.Empty : coordinator[..colon].Trim('[', ']');
        if (Uri.CheckHostName(host) == UriHostNameType.Unknown
            || !ushort.TryParse(coordinator[(colon + 1)..], NumberStyles.None, CultureInfo.InvariantCulture, out var port) || port == 0)
            throw new RigException(ExitCodes.PlanWrong, $"--coordinator wants HOST:PORT, such as coordinator.lab:7443; it is '{coordinator}'.");
        if (days is < 1 or > 3650)
            throw new RigException(ExitCodes.PlanWrong, $"--days must be 1 to 3650; it is {days}.");
        if (File.Exists(folder) || (Directory.Exists(folder) && Directory.EnumerateFileSystemEntries(folder).Any()))
            throw new RigException(ExitCodes.PlanWrong,
                $"{folder} is not empty. Bundles hold keys, so they are never mixed with other files or older bundles: give a new folder.");
        var (plan, _) = PlanLoader.Load(planFolder);
        var address = IPAddress.TryParse(host, out var parsed) ? parsed : null;
        using var authority = LabAuthority.Create(TimeSpan.FromDays(days), TimeProvider.System);
        new BundleWriter(plan, new SetupBuilder(plan), authority, authority.Certificate.NotAfter.ToUniversalTime(), coordinator).WriteAll(
            folder, address is null ? [host] : [], address is null ? [] : [address]);
        screen.Text.WriteLine($"Bundles of {plan.Network.Sites.Count} sites and the coordinator are in {folder}. "
            + "Each site's folder holds its private key and its loads: hand it to that site alone.");
        screen.Text.WriteLine($"Start the coordinator:  halfvoice-coordinator --bundle {folder}/coordinator --state DIR --listen 0.0.0.0:{port}");
        screen.Text.WriteLine($"Start each site:        halfvoice-agent --bundle {folder}/sites/SITE --state DIR");
        return ExitCodes.Passed;
    }
}
