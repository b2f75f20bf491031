using System.CommandLine;
using Halfvoice.Plans;
using Halfvoice.Rig.Terminal;
using Spectre.Console;

namespace Halfvoice.Rig.Commands;

/// <summary><c>keys</c>: every key of plan.yaml with unit, range, default and meaning.</summary>
internal static class KeysCommand
{
    public static Command Create()
    {
        var command = new Command("keys", "List every key of plan.yaml with its unit, range, default and meaning.");
        command.SetAction(_ =>
        {
            var screen = new Screen(false);
            var table = Screen.NewTable("plan.yaml").AddColumn("key").AddColumn("unit").AddColumn("range").AddColumn("default").AddColumn("meaning");
            foreach (var key in PlanKeys.All)
            {
                string[] cells = [key.Path, key.Unit, key.Range, key.Default, key.Meaning];
                table.AddRow(Array.ConvertAll(cells, Markup.Escape));
            }

            screen.Show(table);
            return ExitCodes.Passed;
        });
        return command;
    }
}
