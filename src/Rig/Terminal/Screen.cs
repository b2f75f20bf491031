using Spectre.Console;

namespace Halfvoice.Rig.Terminal;

/// <summary>Where a command writes: results to standard output, progress beside them, errors to standard error.</summary>
public sealed class Screen
{
    /// <param name="json">Whether standard output is kept for one JSON object; everything else then goes to standard error.</param>
    public Screen(bool json)
    {
        Json = json;
        Text = json ? Console.Error : Console.Out;
        Live = json ? !Console.IsErrorRedirected : !Console.IsOutputRedirected;
        Tables = AnsiConsole.Create(new AnsiConsoleSettings { Out = new AnsiConsoleOutput(Text) });
        if (!Live)
            Tables.Profile.Width = 160;
    }

    public bool Json { get; }

    public TextWriter Text { get; }

    /// <summary>Whether <see cref="Text"/> is a terminal.</summary>
    public bool Live { get; }

    public IAnsiConsole Tables { get; }

    /// <summary>A table in the house style.</summary>
    public static Table NewTable(string title) => new Table().Title(Markup.Escape(title)).Border(TableBorder.Simple);

    public void Show(Table table) => Tables.Write(table);
}
