using System.Text.Json;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>What the main job leaves behind.</summary>
[Collection(RealProcesses.Name)]
public sealed class DemoRehearsalTests(DemoRun run) : IClassFixture<DemoRun>
{
    private const UnixFileMode OwnerOnly = UnixFileMode.UserRead | UnixFileMode.UserWrite;

    [Fact]
    public void It_runs_every_cycle_and_the_exit_code_is_the_verdict()
    {
        using var verdict = JsonDocument.Parse(run.Output);
        var root = verdict.RootElement;

        // With real noise a limit may be missed once in a while; that the exit code says so is what is tested.
        Assert.Equal(root.GetProperty("passed").GetBoolean() ? 0 : 1, run.ExitCode);
        Assert.Equal(root.GetProperty("passed").GetBoolean(), root.GetProperty("limits").EnumerateArray().All(limit => limit.GetProperty("passed")
            .GetBoolean()));
        Assert.Equal(3, root.GetProperty("cycles").GetArrayLength());
        Assert.All(root.GetProperty("cycles").EnumerateArray(), cycle => Assert.True(cycle.GetProperty("settled").GetBoolean(), run.Errors));
    }

    [Fact]
    public void The_verdict_has_every_key_in_snake_case_and_is_the_same_on_disk()
    {
        using var printed = JsonDocument.Parse(run.Output);
        using var kept = JsonDocument.Parse(File.ReadAllText(run.Verdict));
        Assert.True(JsonElement.DeepEquals(printed.RootElement, kept.RootElement));

        var root = printed.RootElement;
        AssertHas(root, "passed", "limits", "cycles", "seed", "commit", "options");
        Assert.All(root.GetProperty("limits").EnumerateArray(), limit => AssertHas(limit, "name", "limit", "measured", "unit", "passed"));
        Assert.All(root.GetProperty("cycles").EnumerateArray(), cycle => AssertHas(
            cycle, "settled", "rounds", "seconds", "cost_gap", "reserve_mw", "worst_loading", "bytes", "epsilon_by_site"));
        Assert.Equal(
            ["settle_within", "cost_gap", "line_loading", "reserve_mw", "epsilon_per_day"],
            root.GetProperty("limits").EnumerateArray().Select(limit => limit.GetProperty("name").GetString()));
        Assert.NotEqual("unknown", root.GetProperty("commit").GetString());
    }

    [Fact]
    public void No_site_spends_more_than_its_allowance_and_each_is_told()
    {
        using var verdict = JsonDocument.Parse(run.Output);
        var plan = Checkout.Load(Checkout.Demo);
        foreach (var cycle in verdict.RootElement.GetProperty("cycles").EnumerateArray())
        {
            var spent = cycle.GetProperty("epsilon_by_site").EnumerateObject().ToDictionary(pair => pair.Name, pair => pair.Value.GetDouble());
            Assert.Equal(plan.Network.Sites.Order(StringComparer.Ordinal), spent.Keys.Order(StringComparer.Ordinal));
            Assert.All(spent.Values, epsilon => Assert.InRange(epsilon, 1e-9, plan.Privacy.Epsilon + 1e-9));
        }
    }

    [Fact]
    public void Progress_goes_to_standard_error_and_only_the_verdict_to_standard_output()
    {
        Assert.StartsWith("{", run.Output, StringComparison.Ordinal);
        Assert.DoesNotContain("cycle 1/3", run.Output, StringComparison.Ordinal);
        foreach (var cycle in new[] { "cycle 1/3", "cycle 2/3", "cycle 3/3" })
            Assert.Contains(cycle, run.Errors, StringComparison.Ordinal);
        Assert.Contains("sites joined: 12 of 12", run.Errors, StringComparison.Ordinal);
        Assert.Contains("all 12 sites had joined", run.Errors, StringComparison.Ordinal);
        Assert.Contains("run folder: ", run.Errors, StringComparison.Ordinal);
        Assert.Contains("Mechanism per-round", run.Errors, StringComparison.Ordinal);
        Assert.Contains("no operating instruction", run.Errors, StringComparison.Ordinal);
    }

    [Fact]
    public void The_run_folder_holds_verdict_record_truth_logs_and_the_plan_as_used()
    {
        Assert.Superset(
            new HashSet<string?>(["verdict.json", "record.sqlite", "truth.sqlite", "logs", "plan"]),
            new HashSet<string?>(Directory.EnumerateFileSystemEntries(run.Folder).Select(Path.GetFileName)));
        var logs = Directory.EnumerateFiles(Path.Combine(run.Folder, "logs"), "*.jsonl").Select(Path.GetFileName).ToHashSet();
        var plan = Checkout.Load(Checkout.Demo);
        Assert.Contains("coordinator.jsonl", logs);
        Assert.All(plan.Network.Sites, site => Assert.Contains($"agent-{site}.jsonl", logs));

        var used = PlanWriter.Write(Checkout.Load(Path.Combine(run.Folder, "plan")));
        Assert.Equal(PlanWriter.Write(plan), used);
    }

    [Fact]
    public void Keys_and_everything_private_are_for_their_owner_alone()
    {
        Assert.SkipWhen(OperatingSystem.IsWindows(), "There are no such modes here.");
        Assert.Equal(OwnerOnly | UnixFileMode.UserExecute, ModeOf(run.Folder));
        var keys = Directory.EnumerateFiles(run.Folder, "*.key", SearchOption.AllDirectories).ToList();
        Assert.Equal(13, keys.Count);
        Assert.All(keys, key => Assert.Equal(OwnerOnly, ModeOf(key)));
        Assert.All(
            Directory.EnumerateFiles(run.Folder, "loads.csv", SearchOption.AllDirectories).Append(run.Truth).Append(run.Record),
            path => Assert.Equal(OwnerOnly, ModeOf(path)));
    }

    [Fact]
    public void The_record_has_one_answer_a_component_and_round_asked_and_no_load()
    {
        // Every ask names one row a component that moves; what was answered beyond that are the components that are heard once a cycle.
        Assert.True(RunFiles.Count(run.Record, "SELECT COUNT(*) FROM rounds") >= 3);
        Assert.Equal(0, RunFiles.Count(run.Record, "SELECT COUNT(*) FROM (SELECT cycle, round, site, component "
            + "FROM answers GROUP BY 1, 2, 3, 4 HAVING COUNT(*) > 1)"));
        Assert.Equal(0, RunFiles.Count(run.Record, "SELECT COUNT(*) FROM asks a "
            + "LEFT JOIN answers b USING (cycle, round, site, component) WHERE b.steps IS NULL"));
        Assert.Equal(
            RunFiles.Count(run.Record, "SELECT COUNT(*) FROM cycles") * RunFiles.Count(run.Record, "SELECT COUNT(*) FROM components WHERE adjustable = 0"),
            RunFiles.Count(run.Record, "SELECT COUNT(*) FROM answers a JOIN components c USING (site, component) WHERE c.adjustable = 0"));
        Assert.Equal(
            RunFiles.Count(run.Record, "SELECT COUNT(*) FROM asks"),
            RunFiles.Count(run.Record, "SELECT COUNT(*) FROM answers a JOIN components c USING (site, component) WHERE c.adjustable = 1"));
        Assert.DoesNotContain(RunFiles.Columns(run.Record), column => column.Contains("load", StringComparison.OrdinalIgnoreCase));
        Assert.Equal(12, RunFiles.Count(run.Record, "SELECT COUNT(*) FROM events WHERE kind = 'joined'"));
    }

    [Fact]
    public void The_truth_is_labelled_private_and_has_the_true_loads()
    {
        Assert.StartsWith("PRIVATE", (string)RunFiles.Query(run.Truth, "SELECT value FROM about WHERE key = 'label'")[0][0], StringComparison.Ordinal);
        var plan = Checkout.Load(Checkout.Demo);
        var loads = RunFiles.Query(run.Truth, "SELECT bus, load_mw FROM buses WHERE cycle = 2").ToDictionary(row => (string)row[0], row => (double)row[1]);
        Assert.Equal(plan.LoadMw(2), plan.Network.Buses.Select(bus => loads[bus.Name]));
    }

    private static UnixFileMode ModeOf(string path) => OperatingSystem.IsWindows() ? throw new PlatformNotSupportedException() : File.GetUnixFileMode(path);

    private static void AssertHas(JsonElement element, params string[] keys)
    {
        foreach (var key in keys)
            Assert.True(element.TryGetProperty(key, out _), $"The key {key} is missing.");
        Assert.All(element.EnumerateObject(), pair => Assert.Matches("^[a-z][a-z0-9_]*$", pair.Name));
    }
}
