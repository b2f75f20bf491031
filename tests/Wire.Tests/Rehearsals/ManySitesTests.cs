using System.Globalization;
using System.Text.Json;
using System.Text.RegularExpressions;
using Halfvoice.Rig.Binaries;
using Halfvoice.Tests.Infrastructure;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>A hundred and nineteen real processes.</summary>
[Collection(RealProcesses.Name)]
public sealed partial class ManySitesTests : IDisposable
{
    private readonly TestFolder _folder = new();

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Fact]
    public async Task An_invented_region_of_118_sites_runs_119_processes_to_a_settled_dispatch()
    {
        var binaries = await Checkout.BinariesAsync();
        Assert.SkipUnless(binaries.Kind == BinaryKind.Native, $"So many agents want the native build. {binaries.Reason}");
        var plan = _folder.File("plan");
        Assert.Equal(0, (await Checkout.RunRigAsync(Cancel, "new", plan, "--sites", "118", "--seed", "1")).ExitCode);
        var yaml = Path.Combine(plan, "plan.yaml");
        var text = await File.ReadAllTextAsync(yaml, Cancel);
        Assert.Contains("cycles: 3", text, StringComparison.Ordinal);
        await File.WriteAllTextAsync(yaml, text.Replace("cycles: 3", "cycles: 2", StringComparison.Ordinal), Cancel);

        await using var rig = Checkout.StartRig("rehearse", plan, "--json", "--runs", _folder.File("runs"));
        await rig.WaitForAsync(line => line == "sites joined: 118 of 118", Cancel);
        var agents = Living.ChildrenOf(rig.ProcessId);
        var resident = agents.Select(agent => ResidentIfAlive(agent.ProcessId)).OfType<long>().ToList();
        var code = await rig.EndAsync(Cancel);

        Assert.True(code is 0 or 1, rig.Errors);
        Assert.True(agents.Count == 119, $"{agents.Count} processes were seen.");
        using var verdict = JsonDocument.Parse(rig.Output);
        Assert.Equal(2, verdict.RootElement.GetProperty("cycles").GetArrayLength());
        Assert.All(verdict.RootElement.GetProperty("cycles").EnumerateArray(), cycle => Assert.True(cycle.GetProperty("settled").GetBoolean(), rig.Errors));
        Assert.Equal(118, verdict.RootElement.GetProperty("cycles")[0].GetProperty("epsilon_by_site").EnumerateObject().Count());
        Assert.Matches(ReadyLine(), rig.Errors);

        // Measured, and told to whoever reads the test's output; not judged here, because other work shares the machine.
        TestContext.Current.TestOutputHelper?.WriteLine(ReadyLine().Match(rig.Errors).Value);
        if (resident.Count > 0)
            TestContext.Current.TestOutputHelper?.WriteLine(string.Create(CultureInfo.InvariantCulture,
                $"resident, kB: largest {resident.Max()}, median {resident.Order().ElementAt(resident.Count / 2)}"));
    }

    public void Dispose() => _folder.Dispose();

    private static long? ResidentIfAlive(int processId)
    {
        try
        {
            return Living.ResidentKilobytes(processId);
        }
        catch (Exception gone) when (gone is IOException or InvalidOperationException)
        {
            return null;
        }
    }

    [GeneratedRegex("all 118 sites had joined [0-9.]+ s after the first was started")]
    private static partial Regex ReadyLine();
}
