using System.CommandLine;
using Halfvoice.Rehearsal;
using Halfvoice.Rig.Binaries;
using Halfvoice.Rig.PlanFiles;
using Halfvoice.Rig.Runs;
using Halfvoice.Rig.Terminal;

namespace Halfvoice.Rig.Commands;

/// <summary><c>rehearse PLAN</c>: the whole thing with real processes, ending in a verdict.</summary>
internal static class RehearseCommand
{
    public static Command Create()
    {
        var plan = CommonArguments.Plan();
        var json = CommonArguments.Json();
        var runs = new Option<string>("--runs") { Description = "Folder that run folders are made in.", DefaultValueFactory = _ => "runs" };
        var binaries = new Option<string?>("--binaries") { Description = "Folder with the agent and coordinator to rehearse with, instead of building them." };
        var jit = new Option<bool>("--jit") { Description = "Use the JIT build even where a native one can be made." };
        var command = new Command("rehearse", "Start a coordinator and one agent a site, run the plan's cycles, and judge them by its limits.")
        {
            plan, json, runs, binaries, jit,
        };
        command.SetAction((parse, cancel) => RunAsync(
            parse.GetRequiredValue(plan), parse.GetRequiredValue(runs), new Screen(parse.GetValue(json)),
            new BinaryOptions { Folder = parse.GetValue(binaries), JitOnly = parse.GetValue(jit) }, cancel));
        return command;
    }

    private static async Task<int> RunAsync(string planFolder, string runs, Screen screen, BinaryOptions binaryOptions, CancellationToken cancel)
    {
        var (plan, warnings) = PlanLoader.Load(planFolder);
        var sites = plan.Network.Sites.Count;
        screen.Text.WriteLine($"{plan.Name}: {sites} sites, {plan.Network.Buses.Count} buses, {plan.Cycles} cycles, "
            + $"scheme {Plans.PlanKeys.NameOf(plan.Scheme.Kind)}");
        screen.Text.WriteLine(RunNotes.PrivacyNote(plan));
        foreach (var warning in warnings)
            screen.Text.WriteLine($"warning: {warning.Text}");
        RunNotes.RefuseUnusablePrivacy(plan);
        var binaries = await AgentBinaries.LocateAsync(binaryOptions, screen.Text.WriteLine, cancel).ConfigureAwait(false);
        screen.Text.WriteLine(binaries.Description);
        var folder = RunFolder.Create(runs, plan.Name, TimeProvider.System.GetUtcNow());
        var view = new ProgressView(screen.Text, screen.Live, plan.Cycles, sites, AcceptanceJudge.SettleWithinSeconds(plan), TimeProvider.System);
        var options = new Dictionary<string, string>
        {
            ["plan"] = planFolder,
            ["binaries"] = binaries.Kind.ToString().ToLowerInvariant(),
        };
        var rehearsal = new Runs.Rehearsal(plan, binaries, folder, view);
        var verdict = await rehearsal.RunAsync(options, cancel).ConfigureAwait(false);
        if (rehearsal.ReadyAfter is { } ready)
            screen.Text.WriteLine(FormattableString.Invariant($"all {sites} sites had joined {ready.TotalSeconds:0.00} s after the first was started"));
        VerdictTables.Show(screen, verdict, folder.Path);
        if (screen.Json)
            Console.Out.WriteLine(verdict.ToJson());
        return verdict.Passed ? ExitCodes.Passed : ExitCodes.LimitFailed;
    }
}
