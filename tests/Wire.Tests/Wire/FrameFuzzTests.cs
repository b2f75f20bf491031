using Google.Protobuf;
using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Privacy;
using Halfvoice.Tests.Rehearsals;
using Halfvoice.Wire;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Tests.Wire;

/// <summary>
/// Two hundred thousand wrong frames through the real parsers, the wire's checks and both cores. The one exception that may come
/// is the protobuf parser's own, which gRPC turns into a closed stream.
/// </summary>
[Collection(RealProcesses.Name)]
public sealed class FrameFuzzTests
{
    private const int Frames = 60_000;

    // A site goes forward only, so that one ask about a late round ends most of what it will do: each gets this many.
    private const int FramesALife = 60;
    private const long AllowedGrowthBytes = 48L << 20;

    [Theory]
    [InlineData(SchemeKind.Injection, MechanismKind.None)]
    [InlineData(SchemeKind.Injection, MechanismKind.PerRound)]
    [InlineData(SchemeKind.Angle, MechanismKind.None)]
    [InlineData(SchemeKind.Angle, MechanismKind.PerRound)]
    public void Nothing_that_a_site_sends_breaks_the_coordinator_or_reaches_the_other_sites(SchemeKind scheme, MechanismKind mechanism)
    {
        var plan = PlanOf(scheme, mechanism);
        var mutator = new FrameMutator(1 + (int)scheme + (10 * (int)mechanism));
        var conversation = new HostileConversation(plan, mutator);
        var taken = 0;
        var before = GC.GetTotalMemory(forceFullCollection: true);
        for (var i = 0; i < Frames; i++)
        {
            if (conversation.Finished)
                conversation = new HostileConversation(plan, mutator);
            if (conversation.SendMutated())
                taken++;
        }

        Assert.InRange(taken, Frames / 10, Frames);
        Assert.InRange(GC.GetTotalMemory(forceFullCollection: true) - before, long.MinValue, AllowedGrowthBytes);
        GC.KeepAlive(conversation);
    }

    [Theory]
    [InlineData(SchemeKind.Injection, MechanismKind.None)]
    [InlineData(SchemeKind.Injection, MechanismKind.PerRound)]
    [InlineData(SchemeKind.Angle, MechanismKind.None)]
    [InlineData(SchemeKind.Angle, MechanismKind.PerRound)]
    public void Nothing_that_a_coordinator_sends_breaks_a_site_or_makes_it_spend_more_than_it_may(SchemeKind scheme, MechanismKind mechanism)
    {
        var plan = PlanOf(scheme, mechanism);
        var setup = new SetupBuilder(plan).ForSite("low");
        var mutator = new FrameMutator(100 + (int)scheme + (10 * (int)mechanism));
        var components = scheme == SchemeKind.Injection ? setup.Buses.Count : setup.Copies.Count;
        var answers = 0;
        for (var life = 0; life < Frames / FramesALife; life++)
        {
            var (site, ledger) = (NewSite(setup, plan), new Dictionary<long, ChargeRow>());
            for (var i = 0; i < FramesALife; i++)
            {
                if (ReadMutated(mutator, components, 1 + (i / 40), 1 + (i % 40)) is { } input)
                    answers += Take(site, input, ledger, components);
            }

            AssertWithinAllowance(ledger.Values, plan);
        }

        Assert.InRange(answers, Frames / 20, Frames);
    }

    [Fact]
    public void A_coordinator_cannot_open_new_allowances_by_asking_about_cycles_that_the_plan_does_not_have()
    {
        var plan = PlanOf(SchemeKind.Injection, MechanismKind.PerRound);
        var setup = new SetupBuilder(plan).ForSite("low");
        var site = NewSite(setup, plan);
        foreach (var cycle in new[] { plan.Cycles + 1, int.MaxValue })
        {
            var step = site.Step(new SiteInput.Asked(new Ask(new RoundId(cycle, 1), true, [0], [0])), TimeSpan.FromSeconds(1));
            Assert.Equal(RefusalReason.OutOfRange, Assert.IsType<SiteReply.Refused>(step.Reply).Refusal.Reason);
            Assert.Empty(step.Charges);
        }

        Assert.IsType<SiteReply.Answered>(site.Step(new SiteInput.Asked(new Ask(new RoundId(plan.Cycles, 1), true, [0], [0])), TimeSpan.FromSeconds(1)).Reply);
    }

    private static SiteCore NewSite(SiteSetup setup, Plan plan) =>
        new(setup, new SeriesOf(plan.Loads[setup.Site]), new SeededNoiseSource(3), [], out _);

    /// <returns>1 where the site answered.</returns>
    private static int Take(SiteCore site, SiteInput input, Dictionary<long, ChargeRow> ledger, int components)
    {
        var step = site.Step(input, TimeSpan.FromSeconds(1));
        foreach (var row in step.Charges)
            ledger[row.Id] = row;
        Assert.All(step.SetPoints, point => Assert.True(double.IsFinite(point.Mw)));
        var answered = step.Reply as SiteReply.Answered;
        if (answered is not null)
            Assert.InRange(answered.Answer.Steps.Length, 1, components);
        site.PrepareNoise();
        return answered is null ? 0 : 1;
    }

    private static void AssertWithinAllowance(IEnumerable<ChargeRow> rows, Plan plan)
    {
        var allowed = plan.Privacy.Mechanism == MechanismKind.None ? 0 : (long)(plan.Privacy.Epsilon * 1e12);
        Assert.All(rows.GroupBy(row => row.Cycle), cycle => Assert.InRange(cycle.Sum(row => row.ChargedAnswers * row.EpsilonUnitsEach), 0, allowed));
    }

    private static Plan PlanOf(SchemeKind scheme, MechanismKind mechanism)
    {
        var plan = Checkout.Load(Checkout.Sample);
        return plan with
        {
            Cycles = 40,
            Scheme = plan.Scheme with { Kind = scheme },
            Privacy = plan.Privacy with { Mechanism = mechanism, Epsilon = 50 },
            Rounds = plan.Rounds with { Quorum = 0.5, HoldRounds = 1000 },
            Stop = plan.Stop with { RoundCap = 40 },
        };
    }

    /// <summary>One mutated frame as the agent would see it; null where it is refused before the core.</summary>
    private static SiteInput? ReadMutated(FrameMutator mutator, int components, int cycle, int round)
    {
        double[] Numbers(double scale) => Enumerable.Range(0, components).Select(_ => (mutator.Below(2001) - 1000) * scale / 1000).ToArray();
        CoordinatorMessage template = mutator.Below(12) switch
        {
            0 => new CoordinatorMessage.Welcomed(new Welcome(cycle)),
            1 => new CoordinatorMessage.Refused(new Refusal(new RoundId(cycle, round), RefusalReason.Malformed, "no")),
            2 or 3 => new CoordinatorMessage.Ended(new Outcome(cycle, CycleEnd.Settled, round, Numbers(100), Numbers(40))),
            _ => new CoordinatorMessage.Asked(new Ask(new RoundId(cycle, round), true, Numbers(100), Numbers(40))),
        };
        var message = new SiteWire().Write(template);
        mutator.Change(message);
        V1.FromCoordinator parsed;
        try
        {
            parsed = V1.FromCoordinator.Parser.ParseFrom(mutator.Bytes(message, 0.3));
        }
        catch (InvalidProtocolBufferException)
        {
            return null;
        }

        var (read, fault) = new CoordinatorWire().Read(parsed);
        Assert.True((read is null) != (fault is null));
        return read switch
        {
            FromCoordinatorMessage.Welcomed welcomed => new SiteInput.Welcomed(welcomed.Welcome),
            FromCoordinatorMessage.Asked asked => new SiteInput.Asked(asked.Ask),
            FromCoordinatorMessage.Ended ended => new SiteInput.Ended(ended.Outcome),
            _ => null,
        };
    }

    private sealed class SeriesOf(LoadSeries series) : ILoadReadings
    {
        public bool TryRead(int cycle, Span<double> loadMw)
        {
            series.At(cycle).CopyTo(loadMw);
            return true;
        }
    }
}
