using System.Diagnostics;
using Halfvoice.Tests.Infrastructure;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>Whatever ends the rig, no process of the run outlives it.</summary>
[Collection(RealProcesses.Name)]
public sealed class RigDeathTests : IDisposable
{
    private const int Interrupt = 2;
    private const int Kill = 9;
    private const int Terminate = 15;

    // The exit code of a rehearsal that broke: it says nothing about the plan.
    private const int Broke = 3;

    private readonly TestFolder _folder = new();

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Theory]
    [InlineData(Kill, 137)]
    [InlineData(Terminate, Broke)]
    [InlineData(Interrupt, Broke)]
    public async Task A_rig_that_is_ended_in_the_middle_of_a_run_leaves_no_process_behind(int signal, int exitCode)
    {
        Assert.SkipUnless(OperatingSystem.IsLinux(), "Processes are looked up in /proc.");
        await Checkout.BinariesAsync();
        var plan = Checkout.CopyPlan(Checkout.Demo, _folder.File("plan"), ("cycles: 3", "cycles: 20000"));
        await using var rig = Checkout.StartRig("rehearse", plan, "--runs", _folder.File("runs"));
        await rig.WaitForAsync(line => line.StartsWith("cycle 2/20000", StringComparison.Ordinal), Cancel);

        var children = Living.ChildrenOf(rig.ProcessId);
        Assert.Equal(12, children.Count(child => Path.GetFileName(child.Program) == "halfvoice-agent"));
        Assert.Equal(1, children.Count(child => Path.GetFileName(child.Program) == "halfvoice-coordinator"));
        var processes = children.Select(child => Process.GetProcessById(child.ProcessId)).ToList();
        rig.Signal(signal);

        Assert.Equal(exitCode, await rig.EndAsync(Cancel));
        await Living.GoneAsync(processes, Cancel);
        Assert.DoesNotContain("   at ", rig.Output + rig.Errors, StringComparison.Ordinal);
        if (signal != Kill)
            Assert.Contains("every process of the run has been ended", rig.Errors, StringComparison.Ordinal);
    }

    public void Dispose() => _folder.Dispose();
}
