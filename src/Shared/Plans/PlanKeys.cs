using static Halfvoice.Plans.PlanKeyForms;

namespace Halfvoice.Plans;

/// <summary>A key of plan.yaml: what it is called, what it may be, and what it means.</summary>
/// <param name="Path">Dotted path, for example <c>stop.mismatch</c>; <c>&lt;site&gt;</c> stands for any site's name.</param>
/// <param name="Unit">Unit or form of the value.</param>
/// <param name="Range">What the value may be; the very text that a rejection quotes.</param>
/// <param name="Default">What stands where the key is absent; "required" where it must not be.</param>
/// <param name="Meaning">One sentence.</param>
public sealed record PlanKey(string Path, string Unit, string Range, string Default, string Meaning)
{
    /// <summary>Puts a value into the draft, or returns the rule that it breaks.</summary>
    internal Func<SettingsDraft, string, string?> Apply { get; init; } =
        (_, _) => throw new InvalidOperationException("This key has no rule.");
}

/// <summary>
/// All keys of plan.yaml with their rules: the one table that reading, help and documentation share, so that they
/// cannot drift apart.
/// </summary>
public static class PlanKeys
{
    private static readonly (string Name, SchemeKind Value)[] Schemes = [("angle", SchemeKind.Angle), ("injection", SchemeKind.Injection)];

    private static readonly (string Name, MechanismKind Value)[] Mechanisms =
        [("none", MechanismKind.None), ("per-round", MechanismKind.PerRound)];

    private static readonly (string Name, NoiseKind Value)[] Noises = [("laplace", NoiseKind.Laplace)];

    private static readonly (string Name, PrivacyScope Value)[] Scopes =
    [
        ("round", PrivacyScope.Round),
        ("cycle", PrivacyScope.Cycle),
        ("day", PrivacyScope.Day),
        ("campaign", PrivacyScope.Campaign),
    ];

    /// <summary>Every key, in the order in which a plan is best written.</summary>
    public static IReadOnlyList<PlanKey> All { get; } =
    [
        .. General(), .. SchemeKeys(), .. StopKeys(), .. PrivacyKeys(), .. RoundKeys(),
        .. LinkKeys("links.default.", "the profile local"), .. LinkKeys("links.sites.<site>.", "as links.default"),
        .. AcceptKeys(),
    ];

    internal static IReadOnlyDictionary<string, PlanKey> ByPath { get; } = All.ToDictionary(key => key.Path, StringComparer.Ordinal);

    /// <summary>The name that plan.yaml gives a scheme.</summary>
    public static string NameOf(SchemeKind kind) => Schemes.First(pair => pair.Value == kind).Name;

    /// <summary>The name that plan.yaml gives a mechanism.</summary>
    public static string NameOf(MechanismKind kind) => Mechanisms.First(pair => pair.Value == kind).Name;

    /// <summary>The name that plan.yaml gives a kind of noise.</summary>
    public static string NameOf(NoiseKind kind) => Noises.First(pair => pair.Value == kind).Name;

    /// <summary>The name that plan.yaml gives a scope.</summary>
    public static string NameOf(PrivacyScope scope) => Scopes.First(pair => pair.Value == scope).Name;

    private static PlanKey[] General() =>
    [
        new("name", "text", "1 to 200 characters on one line", "required", "Name of the plan, for people.")
        {
            Apply = (draft, text) =>
            {
                draft.Name = text;
                return text.Trim().Length is 0 or > 200 || text.Any(char.IsControl) ? "must be 1 to 200 characters on one line" : null;
            },
        },
        Number("base_mva", "MVA", new(0, 1e6, LeastIsOpen: true, Unit: "MVA"), "required",
            "Power base that reactances in per unit refer to.", (draft, value) => draft.BaseMva = value!.Value),
        Duration("interval", "1s", "24h", "5m", "Length of a dispatch interval.", (draft, value) => draft.Interval = value),
        Whole("cycles", 1, 100_000, "1", "Dispatch cycles that a rehearsal runs.", (draft, value) => draft.Cycles = value),
    ];

    private static PlanKey[] SchemeKeys() =>
    [
        Choice("scheme.kind", Schemes, "injection", "How sites and coordinator reach agreement.",
            (draft, value) => draft.Scheme = draft.Scheme with { Kind = value }),
        Number("scheme.penalty", "factor, or auto", new(0, 1000, LeastIsOpen: true), "auto (1)",
            "Multiplies the automatic penalty.",
            (draft, value) => draft.Scheme = draft.Scheme with { PenaltyFactor = value ?? 1 }, "auto"),
        Number("scheme.relaxation", "factor, or auto", new(1, 2, MostIsOpen: true), "auto (injection 1.2, angle 1)",
            "Over-relaxation of the exchange.",
            (draft, value) => draft.Scheme = draft.Scheme with { Relaxation = value }, "auto"),
        Number("scheme.price_scale", "$/MWh, or auto", new(0, 1e6, LeastIsOpen: true, Unit: "$/MWh"), "auto (from the plants' costs)",
            "Public price scale that the automatic penalty starts from.",
            (draft, value) => draft.Scheme = draft.Scheme with { PriceScalePerMwh = value }, "auto"),
    ];

    private static PlanKey[] StopKeys() =>
    [
        Fraction("stop.mismatch", new(0, 1, LeastIsOpen: true), "0.5%",
            "A cycle settles only below this mismatch, as a fraction of the reference load.",
            (draft, value) => draft.Stop = draft.Stop with { MismatchFraction = value }),
        Number("stop.price", "$/MWh", new(0, 1e6, LeastIsOpen: true, Unit: "$/MWh"), "0.05",
            "A cycle settles only below this price move.",
            (draft, value) => draft.Stop = draft.Stop with { PriceMovePerMwh = value!.Value }),
        Whole("stop.rounds", 1, 100_000, "200", "Hard cap of rounds in a cycle.",
            (draft, value) => draft.Stop = draft.Stop with { RoundCap = value }),
        Number("stop.reference_load_mw", "MW, or auto", new(0, 1e7, LeastIsOpen: true, Unit: "MW"), "auto (half the installed capacity)",
            "Public figure for total demand that the mismatch limit refers to.",
            (draft, value) => draft.Stop = draft.Stop with { ReferenceLoadMw = value }, "auto"),
    ];

    private static PlanKey[] PrivacyKeys() =>
    [
        Choice("privacy.mechanism", Mechanisms, "per-round", "How answers are veiled; none must be asked for and is announced.",
            (draft, value) => draft.Privacy = draft.Privacy with { Mechanism = value }),
        Choice("privacy.noise", Noises, "laplace", "Distribution of the noise.",
            (draft, value) => draft.Privacy = draft.Privacy with { Noise = value }),
        Number("privacy.adjacency_mw", "MW", new(0, 1e6, LeastIsOpen: true, Unit: "MW"), "1",
            "The change of a site's loads (sum of absolute changes) that must stay hidden.",
            (draft, value) => draft.Privacy = draft.Privacy with { AdjacencyMw = value!.Value }),
        Number("privacy.epsilon", "none", new(0, 1000, LeastIsOpen: true), "1",
            "Privacy allowance of a site within the scope.",
            (draft, value) => draft.Privacy = draft.Privacy with { Epsilon = value!.Value }),
        Number("privacy.delta", "probability", new(0, 1, MostIsOpen: true), "0",
            "Probability allowance beside epsilon; Laplace noise under basic composition spends none of it.",
            (draft, value) => draft.Privacy = draft.Privacy with { Delta = value!.Value }),
        Choice("privacy.scope", Scopes, "cycle", "The period whose answers together spend at most epsilon.",
            (draft, value) => draft.Privacy = draft.Privacy with { Scope = value }),
    ];

    private static PlanKey[] RoundKeys() =>
    [
        Duration("rounds.deadline", "1ms", "1h", "2s", "Time that a round waits for answers.",
            (draft, value) => draft.Rounds = draft.Rounds with { Deadline = value }),
        Fraction("rounds.quorum", new(0, 1, LeastIsOpen: true), "90%",
            "Share of the asked sites that must answer afresh for a round to count.",
            (draft, value) => draft.Rounds = draft.Rounds with { Quorum = value }),
        Whole("rounds.hold_rounds", 0, 1000, "3", "Rounds in a row for which a missing site's last answer may stand in.",
            (draft, value) => draft.Rounds = draft.Rounds with { HoldRounds = value }),
    ];

    private static PlanKey[] LinkKeys(string prefix, string standard) =>
    [
        Choice(prefix + "profile", [.. LinkProfiles.ByName.Keys.Select(name => (name, name))], standard,
            "Named kind of link; its values are typical and unverified.",
            (draft, value) => draft.Link.Profile = value),
        Duration(prefix + "latency", "0ms", "1m", standard, "Typical round trip.",
            (draft, value) => draft.Link.RoundTrip = value),
        Duration(prefix + "jitter", "0ms", "1m", standard, "Typical variation of the round trip.",
            (draft, value) => draft.Link.Jitter = value),
        Fraction(prefix + "loss", new(0, 1, MostIsOpen: true), standard, "Share of packets lost.",
            (draft, value) => draft.Link.LossFraction = value),
        Number(prefix + "rate", "kbit/s, or unlimited", new(0, 1e9, LeastIsOpen: true, Unit: "kbit/s"), standard,
            "Bandwidth in each direction.",
            (draft, value) => draft.Link.RateKbitPerS = value ?? double.PositiveInfinity, "unlimited"),
    ];

    private static PlanKey[] AcceptKeys() =>
    [
        Duration("accept.settle_within", "1ms", "24h", "the interval less 60 s, at least half of it",
            "Every cycle settles within this time.",
            (draft, value) => draft.Accept = draft.Accept with { SettleWithin = value }),
        Fraction("accept.cost_gap", new(0, 10), "1%", "Delivered cost above the central optimum, at most.",
            (draft, value) => draft.Accept = draft.Accept with { CostGapFraction = value }),
        Number("accept.reserve_mw", "MW", new(0, 1e7, Unit: "MW"), "not judged", "Reserve used for balancing, at most.",
            (draft, value) => draft.Accept = draft.Accept with { ReserveMw = value }),
        Fraction("accept.line_loading", new(0, 10, LeastIsOpen: true), "100%", "Loading of any line, at most.",
            (draft, value) => draft.Accept = draft.Accept with { LineLoadingFraction = value }),
        Number("accept.epsilon_per_day", "none", new(0, 1e9), "not judged",
            "Privacy loss of a site in a day of cycles like these, at most.",
            (draft, value) => draft.Accept = draft.Accept with { EpsilonPerDay = value }),
    ];
}
