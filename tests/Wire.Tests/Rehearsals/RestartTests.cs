using System.Globalization;
using System.Text.Json;
using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Rig.Authority;
using Halfvoice.Rig.Runs;
using Halfvoice.Tests.Wire;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>Killed and started again: nothing is asked twice, nothing is spent twice, and the run finishes.</summary>
[Collection(RealProcesses.Name)]
public sealed class RestartTests
{
    private const int Cycles = 300;

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Fact]
    public async Task A_coordinator_that_is_killed_goes_on_from_its_journal_and_asks_no_round_twice()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Demo) with { Cycles = Cycles });
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents();
        for (var kill = 1; kill <= 3; kill++)
        {
            var seen = kill * 40;
            await coordinator.WaitForAsync(line => CycleOf(line) >= seen, Cancel);
            coordinator.Kill();
            Assert.Equal(137, await coordinator.EndAsync(Cancel));
            coordinator = await lab.StartCoordinatorAsync();
        }

        Assert.Equal(0, await coordinator.EndAsync(Cancel));
        foreach (var agent in agents.Values)
            Assert.True(await agent.EndAsync(Cancel) == 0, agent.Errors);

        using var journal = lab.OpenJournal();
        Assert.Equal(Enumerable.Range(1, Cycles), journal.Cycles().Select(cycle => cycle.Cycle));
        var rounds = journal.Rounds().Select(round => (round.Cycle, round.Round)).ToList();
        Assert.Equal(rounds.Count, rounds.Distinct().Count());

        // At each kill at most one asked round can have been left open; every site was asked for it once and never again.
        Assert.InRange(journal.Rounds().Count(round => round.Close is null), 0, 3);
        Assert.DoesNotContain(journal.Events(), e => e.Reason is nameof(RefusalReason.AskChanged)
            or nameof(RefusalReason.Forfeited) or nameof(RefusalReason.BudgetSpent));
        Assert.Equal(3, Count(lab.CoordinatorLog(), "Resuming after"));
        foreach (var site in lab.Plan.Network.Sites)
        {
            Assert.DoesNotContain("AskChanged", lab.AgentLog(site), StringComparison.Ordinal);
            Assert.Equal(4, Count(lab.AgentLog(site), "Joined; next is cycle"));
            AssertWithinAllowance(lab, site);
        }
    }

    [Fact]
    public async Task An_agent_that_is_killed_at_any_moment_takes_part_again_and_spends_no_more_than_it_may()
    {
        const string site = "mill";
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Demo) with { Cycles = Cycles });
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents();
        await coordinator.WaitForAsync(line => CycleOf(line) >= 30, Cancel);
        agents[site].Kill();
        Assert.Equal(137, await agents[site].EndAsync(Cancel));
        agents[site] = lab.StartAgent(site);

        Assert.Equal(0, await coordinator.EndAsync(Cancel));
        foreach (var agent in agents.Values)
            Assert.True(await agent.EndAsync(Cancel) == 0, agent.Errors);

        using var journal = lab.OpenJournal();
        var index = lab.Plan.Network.Sites.ToList().IndexOf(site);
        Assert.Equal(Cycles, journal.Cycles().Count);
        Assert.Equal(2, journal.Events().Count(e => e.Kind == "joined" && e.Site == site));
        Assert.Contains(journal.Rounds(), round => round.Cycle == Cycles && round.Close!.Answers.Any(answer => answer.Site == index));
        Assert.Equal("Settled", journal.Cycles()[^1].End);
        Assert.Equal(0, RunFiles.Count(lab.LedgerOf(site), "SELECT COUNT(*) FROM charges WHERE state = 'Open'"));
        foreach (var name in lab.Plan.Network.Sites)
            AssertWithinAllowance(lab, name);
    }

    [Fact]
    public async Task What_a_killed_agent_had_reserved_is_forfeited_and_never_answered()
    {
        const string held = "mid";
        const string site = "low";
        var plan = Checkout.Load(Checkout.Sample);
        plan = plan with
        {
            Cycles = 3,
            Privacy = new PrivacySettings { Mechanism = MechanismKind.PerRound, Epsilon = 100 },
            Rounds = plan.Rounds with { Deadline = TimeSpan.FromMinutes(10), Quorum = 0.6, HoldRounds = 1000 },
            Stop = plan.Stop with { RoundCap = 60 },
        };
        await using var lab = await Lab.CreateAsync(plan);
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents(held);
        using var identity = lab.Authority.Issue(new IdentityRequest(IdentityRole.Site, held));
        using var client = new SiteClient(lab.Port, identity.Certificate);
        var player = new HonestPart(lab, held);
        var enrol = new V1.Enrol();
        player.Describe(enrol);
        await client.SendAsync(new V1.FromSite { Header = client.Header(), Enrol = enrol });
        var ask = await client.ReadAsync(V1.FromCoordinator.BodyOneofCase.Ask);
        while (ask.Header.Round < 3)
        {
            await player.AnswerAsync(client, ask);
            ask = await client.ReadAsync(V1.FromCoordinator.BodyOneofCase.Ask);
        }

        // Round 3 is asked, so the agent has answered round 2 from its reserved block; our answer is held back until it is back.
        agents[site].Kill();
        Assert.Equal(137, await agents[site].EndAsync(Cancel));
        agents[site] = lab.StartAgent(site);
        await lab.JoinedAsync(site, 2);
        await player.AnswerAsync(client, ask);
        await player.PlayOnAsync(client);

        Assert.Equal(0, await coordinator.EndAsync(Cancel));
        foreach (var agent in agents.Values)
            Assert.True(await agent.EndAsync(Cancel) == 0, agent.Errors);
        using var journal = lab.OpenJournal();
        var index = plan.Network.Sites.ToList().IndexOf(site);
        Assert.Contains("Forfeited", lab.AgentLog(site), StringComparison.Ordinal);
        AssertNoRoundAfterForfeit(lab, site, journal.Rounds(), index);
        Assert.Contains(journal.Rounds(), round => round.Cycle == 3 && round.Close!.Answers.Any(answer => answer.Site == index));
        AssertWithinAllowance(lab, site);
    }

    [Fact]
    public async Task A_stopped_agent_gives_back_what_it_did_not_use_and_ends_with_0()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Demo) with { Cycles = 100_000 });
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents();
        await coordinator.WaitForAsync(line => CycleOf(line) >= 5, Cancel);
        agents["mill"].Signal(15);
        Assert.Equal(0, await agents["mill"].EndAsync(Cancel));
        Assert.Equal(0, RunFiles.Count(lab.LedgerOf("mill"), "SELECT COUNT(*) FROM charges WHERE state IN ('Open', 'Forfeited')"));

        // A stopped coordinator ends its cycle, says farewell, and the agents go home.
        coordinator.Signal(15);
        Assert.Equal(0, await coordinator.EndAsync(Cancel));
        foreach (var agent in agents.Values)
            Assert.True(await agent.EndAsync(Cancel) == 0, agent.Errors);
    }

    private static int CycleOf(string line)
    {
        if (!line.StartsWith("{\"event\":\"cycle\"", StringComparison.Ordinal))
            return 0;
        using var json = JsonDocument.Parse(line);
        return json.RootElement.GetProperty("cycle").GetInt32();
    }

    private static int Count(string text, string part) => text.Split(part).Length - 1;

    /// <summary>What a site was charged in any cycle, reserved rounds included, is at most what the plan allows.</summary>
    private static void AssertWithinAllowance(Lab lab, string site)
    {
        var allowed = (long)(lab.Plan.Privacy.Epsilon * 1e12);
        Assert.Equal(PrivacyScope.Cycle, lab.Plan.Privacy.Scope);
        var spent = RunFiles.Query(lab.LedgerOf(site), """
            SELECT cycle, SUM(epsilon_units_each * (CASE state WHEN 'Settled' THEN used WHEN 'Refused' THEN 0 ELSE answers END)) FROM charges GROUP BY cycle
            """);
        Assert.NotEmpty(spent);
        Assert.All(spent, row => Assert.InRange(Convert.ToInt64(row[1], CultureInfo.InvariantCulture), 0, allowed));
    }

    /// <summary>A forfeited round may have been answered before the kill, in rounds 1 to 3; after the second joining none of the block is.</summary>
    private static void AssertNoRoundAfterForfeit(Lab lab, string site, IReadOnlyList<JournalRound> rounds, int index)
    {
        var row = Assert.Single(RunFiles.Query(lab.LedgerOf(site), "SELECT cycle, first_round, answers FROM charges WHERE state = 'Forfeited'"));
        Assert.Equal([1L, 1L, (long)SiteCore.FirstBlock], row);
        Assert.All(
            rounds.Where(round => round.Cycle == 1 && round.Round is > 3 and <= SiteCore.FirstBlock),
            round => Assert.DoesNotContain(round.Close!.Answers, answer => answer.Site == index));
        Assert.Contains(rounds, round => round.Cycle == 1 && round.Round > 3);
        var charged = RunFiles.Query(lab.LedgerOf(site), "SELECT cycle, first_round, answers FROM charges WHERE state <> 'Refused'")
            .SelectMany(r => Enumerable.Range(Whole(r[1]), Whole(r[2])).Select(round => (Whole(r[0]), round))).ToList();
        Assert.Equal(charged.Count, charged.Distinct().Count());

        static int Whole(object value) => Convert.ToInt32(value, CultureInfo.InvariantCulture);
    }
}
