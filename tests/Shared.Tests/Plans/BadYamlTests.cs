namespace Halfvoice.Tests.Plans;

public class BadYamlTests
{
    private const string Head = "name: Small\nbase_mva: 100\n";

    [Theory]
    [InlineData("privacy:\n  epsilom: 1\n", "plan.yaml:4:3: key is 'privacy.epsilom': is not known: did you mean 'epsilon'?")]
    [InlineData("schem: { kind: angle }\n", "plan.yaml:3:1: key is 'schem': is not known: did you mean 'scheme'?")]
    [InlineData("zzzzzzzzzzz: 1\n", "plan.yaml:3:1: key is 'zzzzzzzzzzz': is not known: known here are name, base_mva")]
    [InlineData("stop.rounds: 20\n", "plan.yaml:3:1: key is 'stop.rounds': is not known")]
    [InlineData("cycles: 2\ncycles: 3\n", "plan.yaml:4:1: key is 'cycles': is there twice, first in line 3")]
    [InlineData("stop: { rounds: 2, rounds: 3 }\n", "plan.yaml:3:20: key is 'stop.rounds': is there twice, first in line 3")]
    [InlineData("stop: 5\n", "plan.yaml:3:7: stop: must have keys of its own: mismatch, price, rounds, reference_load_mw")]
    [InlineData("stop: [5]\n", "plan.yaml:3:7: stop: must have keys of its own")]
    [InlineData("links: { default: lte }\n", "plan.yaml:3:19: links.default: must have keys of its own: profile, latency, jitter, loss, rate")]
    [InlineData("links: { sites: [south] }\n", "plan.yaml:3:17: links.sites: must have the names of sites as keys")]
    [InlineData("links: { sites: { sauth: { profile: lte } } }\n",
        "plan.yaml:3:19: links.sites is 'sauth': must be a site of grid/buses.csv: did you mean 'south'?")]
    [InlineData("links: { sites: { south: { profile: lte }, south: { profile: lte } } }\n", "plan.yaml:3:44: links.sites is 'south': is there twice")]
    [InlineData("links: { sites: { south: lte } }\n", "plan.yaml:3:26: links.sites.south: must have keys of its own")]
    [InlineData("links: { sites: { south: { latancy: 1s } } }\n", "plan.yaml:3:28: key is 'links.sites.south.latancy': is not known: did you mean 'latency'?")]
    [InlineData("scheme: { kind: response }\n", "plan.yaml:3:17: scheme.kind is 'response': must be one of angle, injection")]
    [InlineData("rounds: { quorum: 101% }\n", "plan.yaml:3:19: rounds.quorum is '101%': must be above 0, at most 1 (a fraction; 1 is 100%)")]
    [InlineData("rounds: { quorum: 90 }\n", "plan.yaml:3:19: rounds.quorum is '90': must be above 0, at most 1 (a fraction; 1 is 100%)")]
    [InlineData("interval: 300\n", "plan.yaml:3:11: interval is '300': must be a duration with its unit, such as 600ms, 2s, 5m or 1h")]
    [InlineData("faults: [ { kill: port, at: 20s } ]\n", "plan.yaml:3:9: faults: asks for faults, but this version cannot inject any")]
    [InlineData("faults: none\n", "plan.yaml:3:9: faults: must be a list")]
    [InlineData("cycles: &a 2\nstop: { rounds: *a }\n", "plan.yaml:4:17: uses an alias: write the value out")]
    [InlineData("? [a, b]\n: 1\n", "plan.yaml:3:3: has a list or a map as a key")]
    [InlineData("stop: { rounds: 2\n", "plan.yaml:4:1: is not valid YAML: ")]
    [InlineData("\tcycles: 2\n", "plan.yaml:3:1: is not valid YAML: ")]
    [InlineData("---\nname: Second\n", "plan.yaml:3:1: starts a second document: a plan is one document")]
    public void A_wrong_plan_yaml_is_an_error_with_place_and_rule(string tail, string expected)
    {
        Assert.Contains(
            new PlanTexts().With("plan.yaml", Head + tail).Errors(),
            text => text.StartsWith(expected, StringComparison.Ordinal));
    }

    [Theory]
    [InlineData("", "plan.yaml:1:1: is empty: it needs at least 'name' and 'base_mva'")]
    [InlineData("# nothing\n", "plan.yaml:1:1: is empty: it needs at least 'name' and 'base_mva'")]
    [InlineData("just words\n", "plan.yaml:1:1: must be keys with values")]
    [InlineData("- name\n", "plan.yaml:1:1: must be keys with values")]
    [InlineData("base_mva: 100\n", "plan.yaml: name: is missing: every plan needs it")]
    [InlineData("name: Small\n", "plan.yaml: base_mva: is missing: every plan needs it")]
    public void A_plan_yaml_without_its_two_keys_is_an_error(string text, string expected)
    {
        Assert.StartsWith(expected, new PlanTexts().With("plan.yaml", text).OnlyError(), StringComparison.Ordinal);
    }

    [Fact]
    public void Deep_nesting_is_refused()
    {
        var error = new PlanTexts().With("plan.yaml", Head + "stop: " + new string('[', 5000)).OnlyError();
        Assert.Contains("nested too deeply", error, StringComparison.Ordinal);
    }

    [Fact]
    public void An_empty_list_of_faults_is_fine()
    {
        Assert.Empty(new PlanTexts().With("plan.yaml", Head + "faults: []\n").Read().Errors);
    }

    [Fact]
    public void All_wrong_keys_come_at_once()
    {
        var errors = new PlanTexts().With("plan.yaml", Head + "cycles: x\nstop: { mismatch: 2, price: -1 }\nnope: 1\n").Errors();
        Assert.Equal(4, errors.Length);
    }

    [Fact]
    public void A_plan_without_a_privacy_section_says_that_the_default_stands()
    {
        Assert.False(new PlanTexts().Read().Plan!.Privacy.Stated);
        Assert.True(new PlanTexts().With("plan.yaml", Head + "privacy: { mechanism: none }\n").Read().Plan!.Privacy.Stated);
    }
}
