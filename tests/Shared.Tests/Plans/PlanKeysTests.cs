using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

/// <summary>Every public number of plan.yaml has one rule and one rejection test: this is the table of the rejections.</summary>
public class PlanKeysTests
{
    private static readonly (string Path, string Good, string Bad)[] Cases =
    [
        ("name", "Small", "\"\""),
        ("base_mva", "100", "0"),
        ("interval", "15m", "0.5s"),
        ("cycles", "288", "0"),
        ("scheme.kind", "angle", "angel"),
        ("scheme.penalty", "auto", "0"),
        ("scheme.relaxation", "1.2", "2"),
        ("scheme.price_scale", "55", "-1"),
        ("stop.mismatch", "1.5%", "0"),
        ("stop.price", "0.1", "0"),
        ("stop.rounds", "40", "100001"),
        ("stop.reference_load_mw", "680", "0"),
        ("privacy.mechanism", "none", "one-draw"),
        ("privacy.noise", "laplace", "gaussian"),
        ("privacy.adjacency_mw", "0.1", "0"),
        ("privacy.epsilon", "4", "1000.5"),
        ("privacy.delta", "1e-6", "1"),
        ("privacy.scope", "day", "year"),
        ("rounds.deadline", "600ms", "0ms"),
        ("rounds.quorum", "75%", "101%"),
        ("rounds.hold_rounds", "0", "1001"),
        ("links.default.profile", "fibre", "string"),
        ("links.default.latency", "1.5s", "2m"),
        ("links.default.jitter", "40ms", "-1ms"),
        ("links.default.loss", "0.5%", "100%"),
        ("links.default.rate", "unlimited", "0"),
        ("links.sites.<site>.profile", "uhf-radio", "uhf"),
        ("links.sites.<site>.latency", "600ms", "61s"),
        ("links.sites.<site>.jitter", "0ms", "61s"),
        ("links.sites.<site>.loss", "0.01", "-1%"),
        ("links.sites.<site>.rate", "5000", "-5"),
        ("accept.settle_within", "120s", "25h"),
        ("accept.cost_gap", "0.01", "-1%"),
        ("accept.reserve_mw", "20", "-1"),
        ("accept.line_loading", "105%", "0"),
        ("accept.epsilon_per_day", "300", "-1"),
    ];

    public static TheoryData<string, string, string> Table()
    {
        var data = new TheoryData<string, string, string>();
        foreach (var (path, good, bad) in Cases)
            data.Add(path, good, bad);
        return data;
    }

    [Fact]
    public void Every_key_has_a_rejection_test_and_a_complete_description()
    {
        Assert.Equal(PlanKeys.All.Select(key => key.Path), Cases.Select(entry => entry.Path));
        Assert.All(PlanKeys.All, key =>
        {
            Assert.NotEmpty(key.Unit);
            Assert.NotEmpty(key.Range);
            Assert.NotEmpty(key.Default);
            Assert.EndsWith(".", key.Meaning, StringComparison.Ordinal);
        });
    }

    [Theory]
    [MemberData(nameof(Table))]
    public void A_value_within_the_rule_is_taken(string path, string good, string bad)
    {
        Assert.NotEqual(good, bad);
        Assert.Empty(new PlanTexts().With("plan.yaml", Yaml(path, good)).Read().ErrorLines());
    }

    [Theory]
    [MemberData(nameof(Table))]
    public void A_value_outside_the_rule_is_an_error_with_its_place_and_range(string path, string good, string bad)
    {
        Assert.NotEqual(good, bad);
        var yaml = Yaml(path, bad);
        var key = PlanKeys.All.Single(entry => entry.Path == path);
        var error = Assert.Single(new PlanTexts().With("plan.yaml", yaml).Read().Errors);
        Assert.Equal("plan.yaml", error.File);
        Assert.Equal(yaml.TrimEnd().Split('\n').Length, error.Line);
        Assert.Equal(yaml.TrimEnd().Split('\n')[^1].IndexOf(": ", StringComparison.Ordinal) + 3, error.Column);
        Assert.Equal(bad.Trim('"'), error.Value);
        Assert.Equal(path.Replace("<site>", "south", StringComparison.Ordinal), error.Field);
        Assert.Contains(key.Range.Split(", or")[0], error.Rule, StringComparison.Ordinal);
    }

    [Theory]
    [MemberData(nameof(Table))]
    public void A_list_a_map_and_nothing_are_wrong_types_for_every_key(string path, string good, string bad)
    {
        Assert.NotEqual(good, bad);
        foreach (var wrong in new[] { "[1]", "{ a: 1 }", "", "~" })
        {
            var error = Assert.Single(new PlanTexts().With("plan.yaml", Yaml(path, wrong)).Read().Errors);
            Assert.Contains(PlanKeys.All.Single(entry => entry.Path == path).Range, error.Rule, StringComparison.Ordinal);
        }
    }

    [Theory]
    [MemberData(nameof(Table))]
    public void Nonsense_is_refused_for_every_key_but_the_name(string path, string good, string bad)
    {
        Assert.NotEqual(good, bad);
        foreach (var wrong in new[] { "NaN", "12 parsecs", "1,5", "-.inf", "0x10", "∞" })
        {
            if (path != "name")
                Assert.Single(new PlanTexts().With("plan.yaml", Yaml(path, $"'{wrong}'")).Read().Errors);
        }
    }

    /// <summary>A plan.yaml in block form whose last line holds the key.</summary>
    private static string Yaml(string path, string value)
    {
        var parts = path.Replace("<site>", "south", StringComparison.Ordinal).Split('.');
        var text = path == "name" ? "" : "name: Small\n";
        if (path != "base_mva")
            text += "base_mva: 100\n";
        for (var i = 0; i < parts.Length; i++)
            text += new string(' ', 2 * i) + parts[i] + (i == parts.Length - 1 ? ": " + value : ":") + "\n";
        return text;
    }
}
