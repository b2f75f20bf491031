using System.Globalization;
using System.Text;

namespace Halfvoice.Plans;

/// <summary>Writes plan.yaml, section by section in the order of <see cref="PlanKeys.All"/>.</summary>
internal static class PlanYamlWriter
{
    public static string Write(Plan plan, string comment)
    {
        var text = new StringBuilder();
        foreach (var line in comment.Split('\n', StringSplitOptions.RemoveEmptyEntries))
            text.Append("# ").Append(line.TrimEnd()).Append('\n');
        Pair(text, 0, "name", Quoted(plan.Name));
        Pair(text, 0, "base_mva", Quantity.Number(plan.Network.BaseMva));
        Pair(text, 0, "interval", Quantity.Duration(plan.Interval));
        Pair(text, 0, "cycles", Whole(plan.Cycles));
        Scheme(text, plan.Scheme);
        Stop(text, plan.Stop);
        Privacy(text, plan.Privacy);
        Rounds(text, plan.Rounds);
        Links(text, plan.Links);
        Accept(text, plan.Accept);
        return text.ToString();
    }

    private static void Scheme(StringBuilder text, SchemeSettings scheme)
    {
        Section(text, "scheme");
        Pair(text, 1, "kind", PlanKeys.NameOf(scheme.Kind));
        Pair(text, 1, "penalty", scheme.PenaltyFactor == 1 ? "auto" : Quantity.Number(scheme.PenaltyFactor));
        Pair(text, 1, "relaxation", scheme.Relaxation is { } relaxation ? Quantity.Number(relaxation) : "auto");
        Pair(text, 1, "price_scale", scheme.PriceScalePerMwh is { } scale ? Quantity.Number(scale) : "auto");
    }

    private static void Stop(StringBuilder text, StopSettings stop)
    {
        Section(text, "stop");
        Pair(text, 1, "mismatch", Quantity.Fraction(stop.MismatchFraction));
        Pair(text, 1, "price", Quantity.Number(stop.PriceMovePerMwh));
        Pair(text, 1, "rounds", Whole(stop.RoundCap));
        Pair(text, 1, "reference_load_mw", stop.ReferenceLoadMw is { } load ? Quantity.Number(load) : "auto");
    }

    private static void Privacy(StringBuilder text, PrivacySettings privacy)
    {
        // A section that is written counts as stated, so a plan that leaves the choice open gets none.
        if (!privacy.Stated)
            return;
        Section(text, "privacy");
        Pair(text, 1, "mechanism", PlanKeys.NameOf(privacy.Mechanism));
        Pair(text, 1, "noise", PlanKeys.NameOf(privacy.Noise));
        Pair(text, 1, "adjacency_mw", Quantity.Number(privacy.AdjacencyMw));
        Pair(text, 1, "epsilon", Quantity.Number(privacy.Epsilon));
        Pair(text, 1, "delta", Quantity.Number(privacy.Delta));
        Pair(text, 1, "scope", PlanKeys.NameOf(privacy.Scope));
    }

    private static void Rounds(StringBuilder text, RoundSettings rounds)
    {
        Section(text, "rounds");
        Pair(text, 1, "deadline", Quantity.Duration(rounds.Deadline));
        Pair(text, 1, "quorum", Quantity.Fraction(rounds.Quorum));
        Pair(text, 1, "hold_rounds", Whole(rounds.HoldRounds));
    }

    private static void Links(StringBuilder text, LinkPlan links)
    {
        Section(text, "links");
        Pair(text, 1, "default", Link(links.Default));
        if (links.Sites.Count == 0)
            return;
        text.Append("  sites:\n");
        foreach (var (site, link) in links.Sites)
            Pair(text, 2, Quoted(site), Link(link));
    }

    private static string Link(LinkSettings link)
    {
        var basis = link.Profile is null ? null : LinkProfiles.ByName.GetValueOrDefault(link.Profile);
        var parts = new List<string>();
        if (basis is not null)
            parts.Add("profile: " + basis.Profile);
        if (basis?.RoundTrip != link.RoundTrip)
            parts.Add("latency: " + Quantity.Duration(link.RoundTrip));
        if (basis?.Jitter != link.Jitter)
            parts.Add("jitter: " + Quantity.Duration(link.Jitter));
        if (basis?.LossFraction != link.LossFraction)
            parts.Add("loss: " + Quantity.Fraction(link.LossFraction));
        if (basis?.RateKbitPerS != link.RateKbitPerS)
            parts.Add("rate: " + (double.IsPositiveInfinity(link.RateKbitPerS) ? "unlimited" : Quantity.Number(link.RateKbitPerS)));
        return "{ " + string.Join(", ", parts) + " }";
    }

    private static void Accept(StringBuilder text, AcceptSettings accept)
    {
        Section(text, "accept");
        if (accept.SettleWithin is { } within)
            Pair(text, 1, "settle_within", Quantity.Duration(within));
        Pair(text, 1, "cost_gap", Quantity.Fraction(accept.CostGapFraction));
        if (accept.ReserveMw is { } reserve)
            Pair(text, 1, "reserve_mw", Quantity.Number(reserve));
        Pair(text, 1, "line_loading", Quantity.Fraction(accept.LineLoadingFraction));
        if (accept.EpsilonPerDay is { } epsilon)
            Pair(text, 1, "epsilon_per_day", Quantity.Number(epsilon));
    }

    private static void Section(StringBuilder text, string key) => text.Append(key).Append(":\n");

    private static void Pair(StringBuilder text, int depth, string key, string value) =>
        text.Append(' ', 2 * depth).Append(key).Append(": ").Append(value).Append('\n');

    private static string Whole(int value) => value.ToString(CultureInfo.InvariantCulture);

    /// <summary>A text as a double-quoted scalar of YAML 1.2 where it could be taken for anything but itself.</summary>
    private static string Quoted(string text)
    {
        var plain = text.Length > 0
            && char.IsAsciiLetter(text[0])
            && text.All(character => char.IsAsciiLetterOrDigit(character) || character is ' ' or ',' or '.' or '-' or '_')
            && text[^1] != ' '
            && text.ToLowerInvariant() is not ("null" or "true" or "false" or "yes" or "no" or "on" or "off" or "y" or "n");
        if (plain)
            return text;
        var escaped = text.Replace("\\", "\\\\", StringComparison.Ordinal).Replace("\"", "\\\"", StringComparison.Ordinal);
        return "\"" + escaped + "\"";
    }
}
