using System.Globalization;
using Halfvoice.Rig.Runs;

namespace Halfvoice.Rig.Terminal;

/// <summary>
/// Live progress of a run: one line that rewrites itself on a terminal; elsewhere a line a cycle and one every few seconds.
/// Thread-safe.
/// </summary>
public sealed class ProgressView
{
    private static readonly TimeSpan QuietSpacing = TimeSpan.FromSeconds(5);

    private readonly TextWriter _out;
    private readonly bool _live;
    private readonly int _cycles;
    private readonly int _sites;
    private readonly double _withinSeconds;
    private readonly TimeProvider _time;
    private readonly Lock _gate = new();
    private long _cycleBegan;
    private long _lastQuiet;
    private int _width;

    /// <param name="output">Where to write.</param>
    /// <param name="live">Whether that is a terminal whose line can be rewritten.</param>
    /// <param name="cycles">Cycles of the run.</param>
    /// <param name="sites">Sites of the plan.</param>
    /// <param name="withinSeconds">Time that a cycle may take, s.</param>
    /// <param name="time">The clock.</param>
    public ProgressView(TextWriter output, bool live, int cycles, int sites, double withinSeconds, TimeProvider time)
    {
        _out = output;
        _live = live;
        _cycles = cycles;
        _sites = sites;
        _withinSeconds = withinSeconds;
        _time = time;
        _lastQuiet = time.GetTimestamp();
    }

    /// <summary>Says something that stays on the screen.</summary>
    public void Say(string text)
    {
        lock (_gate)
        {
            Wipe();
            _out.WriteLine(text);
        }
    }

    public void Show(CoordinatorProgress news)
    {
        lock (_gate)
        {
            switch (news.Event)
            {
                case "gathering":
                    Status(string.Create(CultureInfo.InvariantCulture, $"sites joined: {news.Joined} of {_sites}"), news.Joined == _sites);
                    break;
                case "cycle_began":
                    _cycleBegan = _time.GetTimestamp();
                    break;
                case "round":
                    Status(RoundText(news), false);
                    break;
                case "cycle":
                    Wipe();
                    _out.WriteLine(CycleText(news));
                    break;
                default:
                    break;
            }
        }
    }

    private string RoundText(CoordinatorProgress news)
    {
        var left = _withinSeconds - _time.GetElapsedTime(_cycleBegan).TotalSeconds;
        return string.Create(CultureInfo.InvariantCulture,
            $"cycle {news.Cycle}/{_cycles}  round {news.Round}  mismatch {news.MismatchMw:0.00} MW (limit {news.MismatchLimitMw:0.00})"
            + $"  price move {news.PriceMovePerMwh:0.000} $/MWh (limit {news.PriceMoveLimitPerMwh:0.000})"
            + $"  answers {news.Answered}/{news.Asked}  time left {Math.Max(0, left):0} s");
    }

    private string CycleText(CoordinatorProgress news)
    {
        var end = news.Settled ? "settled" : $"NOT settled ({news.End})";
        return string.Create(CultureInfo.InvariantCulture,
            $"cycle {news.Cycle}/{_cycles}  {end} after {news.Rounds} rounds in {news.Seconds:0.00} s"
            + $"  mismatch {news.MismatchMw:0.00} MW (limit {news.MismatchLimitMw:0.00})"
            + $"  price move {news.PriceMovePerMwh:0.000} $/MWh (limit {news.PriceMoveLimitPerMwh:0.000})");
    }

    private void Status(string text, bool always)
    {
        if (_live)
        {
            // The text is cut to the terminal's width, because a wrapped line cannot be rewritten.
            var room = Math.Max(20, WindowWidth() - 1);
            var cut = text.Length > room ? text[..room] : text;
            _out.Write("\r" + cut.PadRight(_width));
            _width = cut.Length;
            _out.Flush();
        }
        else if (always || _time.GetElapsedTime(_lastQuiet) >= QuietSpacing)
        {
            _lastQuiet = _time.GetTimestamp();
            _out.WriteLine(text);
        }
    }

    private void Wipe()
    {
        if (_live && _width > 0)
            _out.Write("\r" + new string(' ', _width) + "\r");
        _width = 0;
    }

    private static int WindowWidth()
    {
        try
        {
            return Console.WindowWidth > 0 ? Console.WindowWidth : 120;
        }
        catch (IOException)
        {
            return 120;
        }
    }
}
