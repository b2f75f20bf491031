using System.Text.Json;
using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Privacy;
using Halfvoice.Rig.Runs;
using Halfvoice.Tests.Infrastructure;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>Without noise, real processes and the cores in one place must agree bit for bit.</summary>
[Collection(RealProcesses.Name)]
public sealed class SampleRehearsalTests : IDisposable
{
    private readonly TestFolder _folder = new();

    [Theory]
    [InlineData("angle")]
    [InlineData("injection")]
    public async Task Real_processes_give_the_very_rounds_answers_and_set_points_of_the_cores_in_one_place(string scheme)
    {
        var planFolder = Checkout.CopyPlan(Checkout.Sample, _folder.File("plan"), ("kind: angle", $"kind: {scheme}"));
        var (code, output, errors) = await Checkout.RunRigAsync(
            TestContext.Current.CancellationToken, "rehearse", planFolder, "--json", "--runs", _folder.File("runs"));
        Assert.True(code == 0, errors);
        Assert.Contains("none", errors, StringComparison.Ordinal);
        var run = RunFiles.Only(_folder.File("runs"));

        var plan = Checkout.Load(planFolder);
        var closed = new List<JournalEntry.RoundClosed>();
        var dispatch = new LocalDispatch(plan, new SetupBuilder(plan), _ => new NoNoise());
        dispatch.Journalled += entry =>
        {
            if (entry is JournalEntry.RoundClosed round)
                closed.Add(round);
        };
        var cycles = dispatch.Run();

        using var verdict = JsonDocument.Parse(output);
        Assert.Equal(cycles.Select(cycle => cycle.Rounds), verdict.RootElement.GetProperty("cycles").EnumerateArray().Select(cycle => cycle
            .GetProperty("rounds").GetInt32()));
        Assert.All(verdict.RootElement.GetProperty("cycles").EnumerateArray(), cycle => Assert.Empty(cycle.GetProperty("epsilon_by_site").EnumerateObject()));
        AssertSameAnswers(run, closed);
        AssertSameSetPoints(run, plan, dispatch, cycles);
    }

    public void Dispose() => _folder.Dispose();

    private static void AssertSameAnswers(string run, List<JournalEntry.RoundClosed> closed)
    {
        using var journal = new JournalReader(Path.Combine(run, "states", "coordinator", "journal.sqlite"));
        var rounds = journal.Rounds();
        Assert.Equal(closed.Count, rounds.Count);
        foreach (var (local, real) in closed.Zip(rounds))
        {
            Assert.Equal((local.Id.Cycle, local.Id.Round), (real.Cycle, real.Round));
            Assert.Equal(
                local.Answers.OrderBy(pair => pair.Site).Select(pair => (pair.Site, string.Join(' ', pair.Answer.Steps))),
                real.Close!.Answers.OrderBy(answer => answer.Site).Select(answer => (answer.Site, string.Join(' ', answer.Steps))));
            Assert.Equal(local.Measure.MismatchMw, real.Close.MismatchMw);
            Assert.Equal(local.Measure.PriceMovePerMwh, real.Close.PriceMovePerMwh);
        }
    }

    private static void AssertSameSetPoints(string run, Plan plan, LocalDispatch dispatch, IReadOnlyList<LocalCycle> cycles)
    {
        var kept = plan.Network.Sites
            .SelectMany(site => SiteLedgerReader.Read(Path.Combine(run, "states", "sites", site, "ledger.sqlite")).SetPoints)
            .ToDictionary(point => (point.Cycle, point.Generator), point => point.Mw);
        Assert.Equal(cycles.Count * plan.Network.Generators.Count, kept.Count);
        foreach (var cycle in cycles)
            Assert.Equal(dispatch.SetPointsMw(cycle.Cycle), plan.Network.Generators.Select(generator => kept[(cycle.Cycle, generator.Name)]));
    }

    private sealed class NoNoise : INoiseSource
    {
        public bool IsPrivate => false;

        public void Fill(Span<byte> bytes) => throw new InvalidOperationException("Mechanism none draws no noise.");
    }
}
