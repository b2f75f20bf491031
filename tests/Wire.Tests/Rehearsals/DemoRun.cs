using Halfvoice.Tests.Infrastructure;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>The demo, rehearsed once by the rig's own executable; the tests look at what it left.</summary>
public sealed class DemoRun : IAsyncLifetime
{
    private readonly TestFolder _folder = new();

    public int ExitCode { get; private set; }

    public string Output { get; private set; } = "";

    public string Errors { get; private set; } = "";

    public string Folder { get; private set; } = "";

    public string Verdict => Path.Combine(Folder, "verdict.json");

    public string Record => Path.Combine(Folder, "record.sqlite");

    public string Truth => Path.Combine(Folder, "truth.sqlite");

    public async ValueTask InitializeAsync()
    {
        var runs = _folder.File("runs");
        (ExitCode, Output, Errors) = await Checkout.RunRigAsync(
            TestContext.Current.CancellationToken, "rehearse", "deploy/plans/sallow-reach", "--json", "--runs", runs);
        Assert.True(ExitCode is 0 or 1, $"exit code {ExitCode}: {Errors}");
        Folder = RunFiles.Only(runs);
    }

    public ValueTask DisposeAsync()
    {
        _folder.Dispose();
        return ValueTask.CompletedTask;
    }
}
