using Google.Protobuf;
using Google.Protobuf.Collections;
using Grpc.Core;
using Halfvoice.Coordination;
using Halfvoice.Rig.Authority;
using Halfvoice.Tests.Rehearsals;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Tests.Wire;

/// <summary>A site with a valid identity that breaks every rule: each gets its typed no, and the others notice nothing.</summary>
[Collection(RealProcesses.Name)]
public sealed class HostileSiteTests
{
    private const string Site = "mid";

    private static readonly (string What, string Reason, Func<SiteClient, Lab, Task> Do)[] _offences =
    [
        ("wrong protocol version", "NotOurPlan", (c, lab) => c.SendAsync(Enrol(c, lab, header: h => h.Protocol = 2))),
        ("no protocol version", "NotOurPlan", (c, lab) => c.SendAsync(Enrol(c, lab, header: h => h.Protocol = 0))),
        ("a skipped sequence number", "OutOfOrder", (c, lab) => c.SendAsync(Enrol(c, lab, header: h => h.Sequence = 2))),
        ("a sequence number of zero", "OutOfOrder", (c, lab) => c.SendAsync(Enrol(c, lab, header: h => h.Sequence = 0))),
        ("a cycle beyond all plans", "OutOfRange", (c, lab) => c.SendAsync(Enrol(c, lab, header: h => h.Cycle = uint.MaxValue))),
        ("an answer before enrolling", "OutOfOrder", (c, _) => c.SendAsync(new V1.FromSite { Header = c.Header(1, 1),
            Answer = new V1.Answer { Everything = true, Steps = { 1 } } })),
        ("a refusal before enrolling", "OutOfOrder", (c, _) => c.SendAsync(new V1.FromSite { Header = c.Header(1, 1), Refusal = new V1.Refusal() })),
        ("a NaN noise scale", "OutOfRange", (c, lab) => c.SendAsync(Enrol(c, lab, e => e.NoiseScale = double.NaN))),
        ("an infinite noise scale", "OutOfRange", (c, lab) => c.SendAsync(Enrol(c, lab, e => e.NoiseScale = double.PositiveInfinity))),
        ("a negative noise scale", "OutOfRange", (c, lab) => c.SendAsync(Enrol(c, lab, e => e.NoiseScale = -1))),
        ("a NaN epsilon", "OutOfRange", (c, lab) => c.SendAsync(Enrol(c, lab, e => e.EpsilonPerAnswer = double.NaN))),
        ("a lattice beyond all numbers", "OutOfRange", (c, lab) => c.SendAsync(Enrol(c, lab, e => e.LatticeExponent = int.MaxValue))),
        ("a name without end", "Malformed", (c, lab) => c.SendAsync(Enrol(c, lab, e => e.Site = new string('x', 100_000)))),
        ("another site's name", "WrongIdentity", (c, lab) => c.SendAsync(Enrol(c, lab, e => e.Site = "high"))),
        ("another plan's digest", "NotOurPlan", (c, lab) => c.SendAsync(Enrol(c, lab, e => e.SetupDigest = "of another plan"))),
        ("an empty message", "Malformed", (c, _) => c.SendAsync(Array.Empty<byte>())),
        ("a header without a body", "Malformed", (c, _) => c.SendAsync(new V1.FromSite { Header = c.Header() })),
        ("a body of the future", "Malformed", (c, _) => c.SendAsync([.. new V1.FromSite { Header = c.Header() }.ToByteArray(), 0xFA, 0x06, 0x02, 0x08, 0x01])),
        ("bytes that are no message", "Malformed", (c, _) => c.SendAsync([0xFF, 0xFF, 0xFF, 0xFF, 0x07, 0x00])),
        ("a message above 1 MiB", "Malformed", (c, _) => c.SendAsync(new V1.FromSite { Header = c.Header(1, 1), Answer = Answer(600_000) })),
        ("more numbers than any site has", "Malformed", (c, _) => c.SendAsync(new V1.FromSite { Header = c.Header(1, 1), Answer = Answer(60_000) })),
    ];

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Fact]
    public async Task Every_offence_before_joining_gets_its_typed_no_and_the_run_goes_on()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents(Site);
        using var identity = lab.Authority.Issue(new IdentityRequest(IdentityRole.Site, Site));

        foreach (var (what, reason, offend) in _offences)
        {
            using var client = new SiteClient(lab.Port, identity.Certificate);
            try
            {
                await offend(client, lab);
            }
            catch (RpcException)
            {
                // The coordinator stops listening in the middle of a message that is too large; its refusal is there to be read.
            }

            var refusal = await client.EndAsync();
            Assert.True(refusal is not null, $"{what}: no refusal came.");
            Assert.True(reason == ((RefusalReason)refusal.Reason).ToString(), $"{what}: {refusal}");
        }

        agents[Site] = lab.StartAgent(Site);
        await AssertSettledAsync(lab, coordinator, agents.Values);
        using var journal = lab.OpenJournal();
        Assert.Equal(
            _offences.Select(offence => offence.Reason),
            journal.Events().Where(e => e is { Kind: "refused", Site: Site }).Select(e => e.Reason));
        foreach (var other in agents.Keys.Where(name => name != Site))
            Assert.Equal(1, journal.Events().Count(e => e.Kind == "joined" && e.Site == other));
    }

    [Fact]
    public async Task Offences_within_a_round_are_refused_and_a_right_answer_still_counts()
    {
        var plan = Checkout.Load(Checkout.Sample);
        plan = plan with { Rounds = plan.Rounds with { Deadline = TimeSpan.FromMinutes(10) } };
        await using var lab = await Lab.CreateAsync(plan);
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents(Site);
        using var identity = lab.Authority.Issue(new IdentityRequest(IdentityRole.Site, Site));
        using var client = new SiteClient(lab.Port, identity.Certificate);
        var player = new HonestPart(lab, Site);
        await client.SendAsync(Enrol(client, lab, player.Describe));
        await client.ReadAsync(V1.FromCoordinator.BodyOneofCase.Welcome);
        var ask = await client.ReadAsync(V1.FromCoordinator.BodyOneofCase.Ask);
        var right = player.AnswerTo(ask);

        await OffendInRoundAsync(client, lab, identity, right);

        // The right answer counts, its repetition does not, and the site plays on honestly to the end.
        await client.SendAsync(new V1.FromSite { Header = client.Header(1, 1), Answer = right });
        await client.SendAsync(new V1.FromSite { Header = client.Header(1, 1), Answer = right });
        await player.PlayOnAsync(client);
        await AssertSettledAsync(lab, coordinator, agents.Values);
        AssertFirstRound(lab, right);
    }

    [Fact]
    public async Task A_site_that_enrols_twice_on_a_stream_is_cut_off_and_may_come_back()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        var coordinator = await lab.StartCoordinatorAsync();
        using var identity = lab.Authority.Issue(new IdentityRequest(IdentityRole.Site, Site));
        for (var time = 0; time < 3; time++)
        {
            using var client = new SiteClient(lab.Port, identity.Certificate);
            var player = new HonestPart(lab, Site);
            await client.SendAsync(Enrol(client, lab, player.Describe));
            await client.ReadAsync(V1.FromCoordinator.BodyOneofCase.Welcome);
            await client.SendAsync(Enrol(client, lab, player.Describe));
            Assert.Equal(V1.RefusalReason.OutOfOrder, (await client.EndAsync())!.Reason);
        }

        await AssertSettledAsync(lab, coordinator, lab.StartAgents().Values);
    }

    private static async Task OffendInRoundAsync(SiteClient client, Lab lab, IssuedIdentity identity, V1.Answer right)
    {
        async Task AssertRefusedAsync(V1.Answer answer, V1.RefusalReason reason)
        {
            await client.SendAsync(new V1.FromSite { Header = client.Header(1, 1), Answer = answer });
            Assert.Equal(reason, (await client.ReadAsync(V1.FromCoordinator.BodyOneofCase.Refusal)).Refusal.Reason);
        }

        await AssertRefusedAsync(new V1.Answer { Everything = right.Everything }, V1.RefusalReason.Malformed);
        await AssertRefusedAsync(Copy(right, steps => steps.Add(1)), V1.RefusalReason.Malformed);
        await AssertRefusedAsync(new V1.Answer { Everything = !right.Everything, Steps = { right.Steps } }, V1.RefusalReason.Malformed);
        await AssertRefusedAsync(Copy(right, steps => steps[0] = long.MaxValue), V1.RefusalReason.OutOfRange);
        await AssertRefusedAsync(Copy(right, steps => steps[^1] = long.MinValue), V1.RefusalReason.OutOfRange);

        // Answers to rounds that were never asked, or are none, are kept as events and answered by nothing.
        await client.SendAsync(new V1.FromSite { Header = client.Header(1, 2), Answer = right });
        await client.SendAsync(new V1.FromSite { Header = client.Header(9, 9), Answer = right });

        // A second stream of the same site is refused; the first one keeps its seat.
        using var second = new SiteClient(lab.Port, identity.Certificate);
        await second.SendAsync(Enrol(second, lab, new HonestPart(lab, Site).Describe));
        Assert.Equal(V1.RefusalReason.AlreadyJoined, (await second.EndAsync())!.Reason);
    }

    private static void AssertFirstRound(Lab lab, V1.Answer right)
    {
        using var journal = lab.OpenJournal();
        var index = lab.Plan.Network.Sites.ToList().IndexOf(Site);
        Assert.Equal(right.Steps, journal.Rounds()[0].Close!.Answers.Single(answer => answer.Site == index).Steps);
        var refused = journal.Events().Where(e => e is { Kind: "refused", Site: Site }).Select(e => e.Reason).ToList();
        Assert.Equal(
            ["Malformed", "Malformed", "Malformed", "OutOfRange", "OutOfRange", "OutOfOrder", "OutOfOrder", "AlreadyJoined", "OutOfOrder"],
            refused);
        Assert.Equal(1, journal.Events().Count(e => e is { Kind: "joined", Site: Site }));
    }

    private static async Task AssertSettledAsync(Lab lab, LineProcess coordinator, IEnumerable<LineProcess> agents)
    {
        Assert.True(await coordinator.EndAsync(Cancel) == 0, coordinator.Errors);
        foreach (var agent in agents)
            Assert.True(await agent.EndAsync(Cancel) == 0, agent.Errors);
        using var journal = lab.OpenJournal();
        Assert.Equal(lab.Plan.Cycles, journal.Cycles().Count);
        Assert.All(journal.Cycles(), cycle => Assert.Equal("Settled", cycle.End));
    }

    private static V1.FromSite Enrol(SiteClient client, Lab lab, Action<V1.Enrol>? change = null, Action<V1.Header>? header = null)
    {
        var message = new V1.FromSite
        {
            Header = client.Header(),
            Enrol = new V1.Enrol { Site = Site, SetupDigest = lab.Setups.Coordinator.SetupDigest, LatticeExponent = -30 },
        };
        change?.Invoke(message.Enrol);
        header?.Invoke(message.Header);
        return message;
    }

    private static V1.Answer Answer(int numbers)
    {
        var answer = new V1.Answer { Everything = true };
        answer.Steps.AddRange(Enumerable.Repeat(1L << 20, numbers));
        return answer;
    }

    private static V1.Answer Copy(V1.Answer answer, Action<RepeatedField<long>> change)
    {
        var copy = answer.Clone();
        change(copy.Steps);
        return copy;
    }
}
