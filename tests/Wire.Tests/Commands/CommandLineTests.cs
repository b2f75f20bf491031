using System.Text.Json;
using Halfvoice.Tests.Infrastructure;
using Halfvoice.Tests.Rehearsals;

namespace Halfvoice.Tests.Commands;

/// <summary>The commands that make, check, solve and pack plans, and how they say no.</summary>
[Collection(RealProcesses.Name)]
public sealed class CommandLineTests : IDisposable
{
    private readonly TestFolder _folder = new();

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Theory]
    [InlineData("dispatch")]
    [InlineData("check")]
    [InlineData("check", "a", "b")]
    [InlineData("check", "a", "--loud")]
    [InlineData("rehearse", "a", "--runs")]
    [InlineData("new", "a", "--sites", "many")]
    [InlineData("new", "a", "--sites", "3", "--sites-by", "moon")]
    [InlineData("optimum", "a", "--cycle", "one")]
    [InlineData("pack", "a", "b")]
    public async Task A_command_line_that_is_wrong_ends_in_2_and_points_to_the_help(params string[] arguments)
    {
        (await RigConsole.RunAsync(arguments)).AssertRefused("--help");
    }

    [Fact]
    public async Task The_help_lists_every_command_and_the_exit_codes()
    {
        var (code, output, _) = await Checkout.RunRigAsync(Cancel, "--help");
        Assert.Equal(0, code);
        foreach (var word in new[] { "rehearse", "check", "optimum", "new", "pack", "keys", "Exit codes: 0 passed, 1 a limit failed, 2", "3",
            "no certification" })
            Assert.Contains(word, output, StringComparison.Ordinal);
        (code, output, _) = await Checkout.RunRigAsync(Cancel, "keys");
        Assert.Equal(0, code);
        Assert.Contains("rounds.quorum", output, StringComparison.Ordinal);
    }

    [Fact]
    public async Task Check_says_what_a_rehearsal_would_do()
    {
        var told = await RigConsole.RunAsync("check", Checkout.Demo);
        Assert.Equal(0, told.ExitCode);
        foreach (var word in new[] { "12, 19", "rounds expected", "bytes a round", "slowest link", "upper-hydro", "privacy", "central optimum" })
            Assert.Contains(word, told.Output, StringComparison.Ordinal);

        var result = await RigConsole.RunAsync("check", Checkout.Demo, "--json");
        Assert.Equal(0, result.ExitCode);
        using var json = JsonDocument.Parse(result.Output);
        foreach (var key in new[]
        {
            "plan", "sites", "buses", "lines", "generators", "rounds_expected", "bytes_per_round", "slowest_site", "slowest_round_trip_ms",
            "mechanism", "privacy", "optimum_per_hour", "warnings",
        })
        {
            Assert.True(json.RootElement.TryGetProperty(key, out _), key);
        }

        Assert.Equal((12, 19), (json.RootElement.GetProperty("sites").GetInt32(), json.RootElement.GetProperty("buses").GetInt32()));
        Assert.Equal("per-round", json.RootElement.GetProperty("mechanism").GetString());
        Assert.Equal("upper-hydro", json.RootElement.GetProperty("slowest_site").GetString());
        Assert.Equal(12, json.RootElement.GetProperty("privacy").EnumerateArray().Sum(group => group.GetProperty("sites").GetArrayLength()));
        Assert.All(json.RootElement.GetProperty("privacy").EnumerateArray(), group => Assert.Equal(2, group.GetProperty("epsilon_per_cycle").GetDouble(), 9));
        Assert.Equal(3, json.RootElement.GetProperty("optimum_per_hour").GetArrayLength());
    }

    [Fact]
    public async Task Optimum_prints_one_json_object_that_balances()
    {
        var result = await RigConsole.RunAsync("optimum", Checkout.Demo, "--json", "--cycle", "2");
        Assert.Equal(0, result.ExitCode);
        using var json = JsonDocument.Parse(result.Output);
        var root = json.RootElement;
        Assert.Equal("optimal", root.GetProperty("status").GetString());
        var plan = Checkout.Load(Checkout.Demo);
        var load = plan.LoadMw(2).Sum();
        Assert.Equal(load, root.GetProperty("dispatch_mw").EnumerateObject().Sum(pair => pair.Value.GetDouble()), 1e-6 * load);
        Assert.Equal(plan.Network.Buses.Select(bus => bus.Name), root.GetProperty("price_per_mwh").EnumerateObject().Select(pair => pair.Name));
        Assert.Equal(plan.Network.Lines.Select(line => line.Name), root.GetProperty("flow_mw").EnumerateObject().Select(pair => pair.Name));
        Assert.True(root.GetProperty("cost_per_hour").GetDouble() > 0);
        Assert.True(root.GetProperty("seconds").GetDouble() >= 0);
        (await RigConsole.RunAsync("optimum", Checkout.Demo, "--cycle", "0")).AssertRefused("--cycle counts from 1");
    }

    [Fact]
    public async Task An_infeasible_plan_is_told_in_megawatts_and_by_name_by_every_command()
    {
        using var plan = new PlanTexts();
        plan.Replace("grid/generators.csv", "0,100,0.1", "0,15,0.1");
        plan.Replace("grid/generators.csv", "0,50,0,30", "0,5,0,30");
        var printed = await RigConsole.RunAsync("optimum", plan.Folder, "--json");
        printed.AssertRefused("13.5", "MW");
        using var json = JsonDocument.Parse(printed.Output);
        Assert.Equal("infeasible", json.RootElement.GetProperty("status").GetString());
        Assert.Equal(13.5, json.RootElement.GetProperty("unserved_mw").GetDouble(), 1e-4);
        Assert.Equal(JsonValueKind.Null, json.RootElement.GetProperty("cost_per_hour").ValueKind);
        foreach (var command in new[] { "optimum", "check", "rehearse" })
            (await RigConsole.RunAsync([command, plan.Folder, .. command == "rehearse" ? new[] { "--runs", _folder.File("runs") } : []]))
                .AssertRefused("13.5", "MW", "cannot be served");
    }

    [Fact]
    public async Task A_line_that_is_too_small_is_told_by_its_bus()
    {
        using var plan = new PlanTexts();
        plan.Replace("loads/north.csv", "A,10.5", "A,190");
        plan.Replace("grid/generators.csv", "0,100,0.1", "0,1,0.1");
        plan.Replace("grid/generators.csv", "0,50,0,30", "0,500,0,30");
        var result = await RigConsole.RunAsync("optimum", plan.Folder);
        result.AssertRefused("MW", "A");
    }

    [Fact]
    public async Task New_never_writes_into_a_folder_that_holds_something()
    {
        await File.WriteAllTextAsync(_folder.File("mine.txt"), "precious", Cancel);
        (await RigConsole.RunAsync("new", _folder.Path, "--sites", "5")).AssertRefused("is not empty");
        (await RigConsole.RunAsync("new", _folder.File("mine.txt"), "--sites", "5")).AssertRefused("is not empty");
        Assert.Equal(["mine.txt"], Directory.EnumerateFileSystemEntries(_folder.Path).Select(Path.GetFileName));
    }

    [Theory]
    [InlineData("--sites N")]
    [InlineData("3 to 5000", "--sites", "2")]
    [InlineData("3 to 5000", "--sites", "5001")]
    [InlineData("1 to 20", "--sites", "5", "--buses-per-site", "21")]
    [InlineData("--costs goes with", "--sites", "5", "--costs", "x.csv")]
    [InlineData("there is no such file", "--from-cdf", "nowhere.txt")]
    [InlineData("give one of them", "--sites", "5", "--from-cdf", "nowhere.txt")]
    public async Task New_says_what_it_cannot_make(string words, params string[] options)
    {
        (await RigConsole.RunAsync(["new", _folder.File("plan"), .. options])).AssertRefused(words);
        Assert.False(Directory.Exists(_folder.File("plan")));
    }

    [Theory]
    [InlineData(3)]
    [InlineData(40)]
    public async Task What_new_invents_is_sound_and_the_same_for_the_same_seed(int sites)
    {
        var size = sites.ToString(System.Globalization.CultureInfo.InvariantCulture);
        foreach (var name in new[] { "first", "second" })
            Assert.Equal(0, (await RigConsole.RunAsync("new", _folder.File(name), "--sites", size, "--seed", "7")).ExitCode);
        Assert.Equal(
            await File.ReadAllTextAsync(Path.Combine(_folder.File("first"), "grid", "lines.csv"), Cancel),
            await File.ReadAllTextAsync(Path.Combine(_folder.File("second"), "grid", "lines.csv"), Cancel));
        var check = await RigConsole.RunAsync("check", _folder.File("first"), "--json");
        Assert.True(check.ExitCode == 0, check.Errors);
        using var json = JsonDocument.Parse(check.Output);
        Assert.Equal(sites, json.RootElement.GetProperty("sites").GetInt32());
    }

    [Fact]
    public async Task A_solved_case_in_the_common_data_format_becomes_a_plan_that_checks()
    {
        var cases = Path.Combine(Checkout.Folder, "..", "shared", "cases", "cdf", "ieee14cdf.txt");
        Assert.SkipUnless(File.Exists(cases), "The folder shared/cases with the published cases is not beside the project.");
        var made = await RigConsole.RunAsync("new", _folder.File("plan"), "--from-cdf", cases);
        Assert.True(made.ExitCode == 0, made.Errors);
        var check = await RigConsole.RunAsync("check", _folder.File("plan"), "--json");
        Assert.True(check.ExitCode == 0, check.Errors);
        using var json = JsonDocument.Parse(check.Output);
        Assert.Equal((14, 20), (json.RootElement.GetProperty("buses").GetInt32(), json.RootElement.GetProperty("lines").GetInt32()));
    }

    [Fact]
    public async Task A_damaged_case_is_refused_with_its_place()
    {
        await File.WriteAllTextAsync(_folder.File("case.txt"), "this is no case\n", Cancel);
        (await RigConsole.RunAsync("new", _folder.File("plan"), "--from-cdf", _folder.File("case.txt"))).AssertRefused("case.txt");
        Assert.False(Directory.Exists(_folder.File("plan")));
    }

    [Fact]
    public async Task Rehearse_says_where_it_cannot_write()
    {
        await File.WriteAllTextAsync(_folder.File("file"), "x", Cancel);
        await Checkout.BinariesAsync();
        foreach (var runs in new[] { _folder.File("file"), Path.Combine(_folder.File("file"), "below"), "/proc/runs" })
        {
            var (code, output, errors) = await Checkout.RunRigAsync(Cancel, "rehearse", Checkout.Sample, "--json", "--runs", runs);
            Assert.Equal(3, code);
            Assert.Empty(output);
            Assert.Contains($"The run folder cannot be made under {runs}", errors, StringComparison.Ordinal);
            Assert.DoesNotContain("   at ", errors, StringComparison.Ordinal);
        }
    }

    [Fact]
    public async Task Rehearse_says_which_binaries_are_not_there()
    {
        var result = await RigConsole.RunAsync("rehearse", Checkout.Sample, "--binaries", _folder.Path, "--runs", _folder.File("runs"));
        Assert.Equal(3, result.ExitCode);
        Assert.Contains("halfvoice-agent", result.Errors, StringComparison.Ordinal);
        Assert.False(Directory.Exists(_folder.File("runs")));
    }

    public void Dispose() => _folder.Dispose();
}
