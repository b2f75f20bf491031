namespace Halfvoice.Containers;

public sealed class DispatchTests(ContainerEngine engine)
{
    /// <summary>A bound on how long a hung lab can block the run; a healthy one takes seconds.</summary>
    private static readonly TimeSpan Patience = TimeSpan.FromMinutes(4);

    [Fact]
    public async Task The_dispatch_of_the_demo_plan_settles_across_thirteen_containers()
    {
        engine.RequireImages();
        using var patience = CancellationTokenSource.CreateLinkedTokenSource(TestContext.Current.CancellationToken);
        patience.CancelAfter(Patience);

        using var bundles = await LabBundles.PackAsync(
            Repository.PathOf("deploy", "plans", "sallow-reach"), $"{Lab.CoordinatorName}:{Lab.CoordinatorPort}", patience.Token);
        Assert.Equal(12, bundles.Sites.Count);
        await using var lab = await Lab.StartAsync(bundles, patience.Token);
        var exits = await lab.ExitCodesAsync(patience.Token);
        var output = await lab.CoordinatorOutputAsync(patience.Token);

        var cycles = CycleLine.Read(output);
        Assert.NotEmpty(cycles);
        Assert.Equal(Enumerable.Range(1, cycles.Count), cycles.Select(c => c.Cycle));
        Assert.All(cycles, c => Assert.True(c.Settled, $"Cycle {c.Cycle} did not settle:\n{output}"));
        Assert.Equal(13, exits.Count);
        Assert.All(exits, exit => Assert.True(exit.Value == 0, $"{exit.Key} ended with exit code {exit.Value}."));
    }
}
