using System.Security.Cryptography;
using System.Text;
using Halfvoice.Tests.Infrastructure;
using Halfvoice.Tests.Rehearsals;

namespace Halfvoice.Tests.Commands;

/// <summary>A wrong plan ends in exit code 2 with every error listed by file, line and rule, whatever command reads it.</summary>
[Collection(RealProcesses.Name)]
public sealed class BadPlanTests : IDisposable
{
    private readonly PlanTexts _plan = new();

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Fact]
    public async Task The_plan_that_is_broken_here_is_sound_before()
    {
        var result = await RigConsole.RunAsync("check", _plan.Folder);
        Assert.True(result.ExitCode == 0, result.Errors);
    }

    [Theory]
    [InlineData("grid/buses.csv", "bus,site", "bus,place", "grid/buses.csv:1", "site")]
    [InlineData("grid/lines.csv", ",reactance_pu", ",", "grid/lines.csv:1", "reactance_pu")]
    [InlineData("grid/generators.csv", "cost_linear,", "", "grid/generators.csv:", "cost_linear")]
    [InlineData("grid/buses.csv", "C,south", "A,south", "grid/buses.csv:4", "A")]
    [InlineData("grid/lines.csv", "L2,B", "L1,B", "grid/lines.csv:3", "L1")]
    [InlineData("grid/generators.csv", "G2,C", "G1,C", "grid/generators.csv:3", "G1")]
    [InlineData("grid/lines.csv", "A,B,0.1", "A,Z,0.1", "grid/lines.csv:2", "Z")]
    [InlineData("grid/generators.csv", "G2,C", "G2,Z", "grid/generators.csv:3", "Z")]
    [InlineData("grid/lines.csv", "0.1,80", "NaN,80", "grid/lines.csv:2", "reactance_pu")]
    [InlineData("grid/generators.csv", "0,100,0.1", "0,Infinity,0.1", "grid/generators.csv:2", "max_mw")]
    [InlineData("grid/generators.csv", "0,100,0.1", "0,1e999,0.1", "grid/generators.csv:2", "max_mw")]
    [InlineData("grid/lines.csv", "0.1,80", "0.1,-80", "grid/lines.csv:2", "limit_mw")]
    [InlineData("grid/generators.csv", "0,100,0.1", "101,100,0.1", "grid/generators.csv:2", "min_mw")]
    [InlineData("grid/lines.csv", "0.1,80", "0,80", "grid/lines.csv:2", "reactance_pu")]
    [InlineData("loads/south.csv", "C,3", "A,3", "loads/south.csv:3", "A")]
    [InlineData("loads/south.csv", "B,20", "B,NaN", "loads/south.csv:2", "load_mw")]
    [InlineData("plan.yaml", "base_mva: 100", "base_mva: 100\nquorums: 90%", "plan.yaml:3", "quorums")]
    [InlineData("plan.yaml", "base_mva: 100", "base_mva: 100\nrounds: { quorum: 101% }", "plan.yaml:3", "rounds.quorum")]
    [InlineData("plan.yaml", "base_mva: 100", "base_mva: 100\nrounds: { qorum: 90% }", "plan.yaml:3", "quorum")]
    [InlineData("plan.yaml", "base_mva: 100", "base_mva: 100\nscheme: { kind: telepathy }", "plan.yaml:3", "injection")]
    [InlineData("plan.yaml", "name: Small\n", "", "plan.yaml", "name")]
    [InlineData("plan.yaml", "base_mva: 100", "base_mva: [100", "plan.yaml", "")]
    public async Task Each_fault_is_told_with_its_place(string file, string old, string replacement, string place, string word)
    {
        _plan.Replace(file, old, replacement);
        foreach (var command in new[] { "check", "rehearse", "optimum" })
            (await RunAsync(command)).AssertRefused(place, word);
    }

    [Fact]
    public async Task A_site_named_in_two_places_is_told()
    {
        // Two load files that name the same site once the system's rules for names are taken away.
        _plan.Put("loads/South.csv", "bus,load_mw\nB,1\n");
        (await RunAsync("check")).AssertRefused("South");
    }

    [Fact]
    public async Task An_island_that_cannot_serve_itself_is_told_with_its_buses()
    {
        _plan.Put("grid/lines.csv", "line,from_bus,to_bus,reactance_pu,limit_mw\nL1,A,C,0.1,80\n");
        foreach (var command in new[] { "check", "rehearse" })
            (await RunAsync(command)).AssertRefused("B");
    }

    [Fact]
    public async Task All_errors_are_listed_at_once()
    {
        _plan.Replace("grid/buses.csv", "C,south", "A,south");
        _plan.Replace("grid/lines.csv", "0.1,80", "0,-80");
        _plan.Replace("grid/generators.csv", "G2,C", "G2,Z");
        _plan.Replace("loads/north.csv", "10.5", "much");
        _plan.Replace("plan.yaml", "base_mva: 100", "base_mva: -1\nrounds: { quorum: 200% }");
        foreach (var command in new[] { "check", "rehearse" })
        {
            (await RunAsync(command)).AssertRefused(
                "errors:", "grid/buses.csv:4", "grid/lines.csv:2:4", "grid/lines.csv:2:5", "grid/generators.csv:3", "loads/north.csv:2",
                    "plan.yaml:2", "plan.yaml:3");
        }
    }

    [Fact]
    public async Task An_unknown_key_is_told_with_the_nearest_known_one()
    {
        _plan.Replace("plan.yaml", "base_mva: 100", "base_mva: 100\ncicles: 3");
        (await RunAsync("check")).AssertRefused("plan.yaml:3", "cicles", "cycles");
    }

    [Theory]
    [InlineData("grid/buses.csv")]
    [InlineData("grid/lines.csv")]
    [InlineData("loads/south.csv")]
    [InlineData("plan.yaml")]
    public async Task Fifty_megabytes_of_garbage_are_refused(string file)
    {
        var garbage = new byte[50_000_000];
        RandomNumberGenerator.Fill(garbage);
        _plan.Put(file, garbage);
        var (code, output, errors) = await Checkout.RunRigAsync(Cancel, "check", _plan.Folder);
        new RigResult(code, output, errors).AssertRefused(file);
        Assert.InRange(errors.Length, 1, 100_000);
    }

    [Theory]
    [InlineData("plan.yaml")]
    [InlineData("grid/buses.csv")]
    [InlineData("loads/south.csv")]
    public async Task A_file_in_another_encoding_is_told(string file)
    {
        var text = await File.ReadAllTextAsync(Path.Combine(_plan.Folder, file), Cancel);
        _plan.Put(file, Encoding.Unicode.GetBytes(text));
        (await RunAsync("check")).AssertRefused(file, "UTF-8");
        _plan.Put(file, [.. Encoding.Latin1.GetBytes("# Küste\n"), .. Encoding.UTF8.GetBytes(text)]);
        (await RunAsync("check")).AssertRefused(file, "UTF-8");
    }

    [Fact]
    public async Task An_empty_folder_a_missing_one_and_a_file_are_told()
    {
        using var empty = new TestFolder();
        foreach (var command in new[] { "check", "optimum", "rehearse" })
        {
            (await RigConsole.RunAsync(command, empty.Path)).AssertRefused("plan.yaml");
            (await RigConsole.RunAsync(command, empty.File("nowhere"))).AssertRefused("is not there");
            (await RigConsole.RunAsync(command, Path.Combine(_plan.Folder, "plan.yaml"))).AssertRefused("is a file");
        }
    }

    [Fact]
    public async Task No_error_quotes_a_load()
    {
        _plan.Replace("loads/north.csv", "A,10.5", "A,10.5x8675309");
        var result = await RunAsync("check");
        result.AssertRefused("loads/north.csv:2");
        Assert.DoesNotContain("8675309", result.Errors, StringComparison.Ordinal);
    }

    [Fact]
    public async Task A_wrong_plan_ends_the_rigs_own_process_with_2_and_words_on_standard_error_only()
    {
        _plan.Replace("grid/lines.csv", "0.1,80", "0,80");
        foreach (var arguments in new string[][] { ["check", _plan.Folder, "--json"], ["rehearse", _plan.Folder, "--json"] })
        {
            var (code, output, errors) = await Checkout.RunRigAsync(Cancel, arguments);
            new RigResult(code, output, errors).AssertRefused("grid/lines.csv:2");
            Assert.Empty(output);
        }
    }

    [Fact]
    public async Task Privacy_figures_that_give_no_noise_are_told_before_anything_starts()
    {
        _plan.Replace("plan.yaml", "base_mva: 100", "base_mva: 100\nprivacy: { epsilon: 1e-12, scope: campaign }\ncycles: 100000");
        using var runs = new TestFolder();
        (await RigConsole.RunAsync("rehearse", _plan.Folder, "--runs", runs.File("runs"))).AssertRefused("privacy");
        Assert.False(Directory.Exists(runs.File("runs")));
    }

    public void Dispose() => _plan.Dispose();

    private Task<RigResult> RunAsync(string command) => RigConsole.RunAsync(command, _plan.Folder);
}
