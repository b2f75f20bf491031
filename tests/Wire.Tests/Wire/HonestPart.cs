using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Privacy;
using Halfvoice.Tests.Rehearsals;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Tests.Wire;

/// <summary>What a site's own agent would say, from the same core: for tests that hold a site's part of the stream in their hands.</summary>
internal sealed class HonestPart(Lab lab, string site)
{
    private readonly SiteCore _core = new(
        lab.Setups.ForSite(site), new Readings(lab.Plan.Loads[site]), new SeededNoiseSource(11), [], out _);

    public void Describe(V1.Enrol enrol)
    {
        var own = _core.Enrolment();
        (enrol.Site, enrol.SetupDigest) = (site, own.SetupDigest);
        (enrol.LatticeExponent, enrol.NoiseScale, enrol.EpsilonPerAnswer) = (own.LatticeExponent, own.NoiseScale, own.EpsilonPerAnswer);
    }

    public V1.Answer AnswerTo(V1.FromCoordinator message)
    {
        var id = new RoundId((int)message.Header.Cycle, (int)message.Header.Round);
        var step = _core.Step(new SiteInput.Asked(new Ask(id, message.Ask.Everything, [.. message.Ask.Consensus], [.. message.Ask.Dual])), TimeSpan
            .FromSeconds(1));
        var answer = Assert.IsType<SiteReply.Answered>(step.Reply).Answer;
        return new V1.Answer { Everything = answer.Everything, Steps = { answer.Steps } };
    }

    /// <summary>Answers every ask until the farewell.</summary>
    public async Task PlayOnAsync(SiteClient client)
    {
        while (await client.ReadAsync() is { } message && message.BodyCase != V1.FromCoordinator.BodyOneofCase.Farewell)
        {
            if (message.BodyCase == V1.FromCoordinator.BodyOneofCase.Ask)
                await AnswerAsync(client, message);
        }

        await client.CompleteAsync();
    }

    public Task AnswerAsync(SiteClient client, V1.FromCoordinator ask) => client.SendAsync(
        new V1.FromSite { Header = client.Header((int)ask.Header.Cycle, (int)ask.Header.Round), Answer = AnswerTo(ask) });

    private sealed class Readings(LoadSeries series) : ILoadReadings
    {
        public bool TryRead(int cycle, Span<double> loadMw)
        {
            series.At(cycle).CopyTo(loadMw);
            return true;
        }
    }
}
