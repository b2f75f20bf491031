using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>What names and numbers of a grid may be; shared by the plan's CSV files and by imports.</summary>
internal static class GridRules
{
    public static readonly NumberRule Coordinate = new(-1e6, 1e6, Unit: "km");
    public static readonly NumberRule Reactance = new(-1e6, 1e6, Unit: "per unit");
    public static readonly NumberRule Resistance = new(-1e6, 1e6, Unit: "per unit");
    public static readonly NumberRule Limit = new(0, 1e7, LeastIsOpen: true, Unit: "MW");
    public static readonly NumberRule Power = new(-1e6, 1e6, Unit: "MW");
    public static readonly NumberRule CostQuadratic = new(0, 1e6, Unit: "$/MW²h");
    public static readonly NumberRule CostLinear = new(-1e6, 1e6, Unit: "$/MWh");
    public static readonly NumberRule CostFixed = new(-1e12, 1e12, Unit: "$/h");

    /// <summary>Below this a reactance is as good as zero and would swamp every other line.</summary>
    public const double LeastReactancePu = 1e-9;

    private const int LongestName = 100;
    private const int LongestSite = 63;

    /// <summary>The rule that a name of a bus, line or generator breaks, or null.</summary>
    public static string? BrokenName(string name)
    {
        if (name.Length == 0)
            return "must not be blank: it needs a name";
        if (name.Length > LongestName)
            return "must have at most 100 characters";
        return name.Any(char.IsControl) || char.IsWhiteSpace(name[0]) || char.IsWhiteSpace(name[^1])
            ? "must not have control characters, nor blanks at its ends"
            : null;
    }

    /// <summary>The rule that a site's name breaks, or null. Sites name files, certificates and folders.</summary>
    public static string? BrokenSite(string site)
    {
        if (site.Length == 0)
            return "must not be blank: every bus belongs to a site";
        var safe = site.Length <= LongestSite
            && site.All(character => char.IsAsciiLetterOrDigit(character) || character is '.' or '_' or '-')
            && char.IsAsciiLetterOrDigit(site[0])
            && site[^1] != '.';
        return safe
            ? null
            : "must be 1 to 63 letters, digits, '.', '_' or '-', start with a letter or digit and not end with '.': it names files";
    }

    /// <summary>The rule that a reactance breaks, or null.</summary>
    public static string? BrokenReactance(double reactancePu)
    {
        if (reactancePu == 0)
            return "must not be zero: give the reactance of the line, or join the two buses into one";
        return Math.Abs(reactancePu) < LeastReactancePu ? "must be at least 1e-9 per unit away from zero" : Reactance.Broken(reactancePu);
    }

    /// <summary>A few names out of many, for messages.</summary>
    public static string Some(IReadOnlyCollection<string> names)
    {
        const int shown = 10;
        var text = string.Join(", ", names.Take(shown).Select(PlanError.Quotable));
        return names.Count > shown ? $"{text} and {names.Count - shown} more" : text;
    }

    /// <summary>Names of a network's buses, for messages.</summary>
    public static string BusNames(Network network, int[] buses) => Some(Array.ConvertAll(buses, bus => network.Buses[bus].Name));
}
