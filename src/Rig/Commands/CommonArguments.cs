using System.CommandLine;

namespace Halfvoice.Rig.Commands;

/// <summary>Arguments and options that several commands take.</summary>
internal static class CommonArguments
{
    public static Argument<string> Plan() => new("PLAN") { Description = "A plan folder: plan.yaml, grid/*.csv, loads/*.csv." };

    public static Option<bool> Json() => new("--json") { Description = "Print one JSON object on standard output; everything else goes to standard error." };
}
