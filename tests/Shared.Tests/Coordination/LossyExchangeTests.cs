using System.Globalization;
using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Coordination;

/// <summary>
/// Both cores on invented plans over a network that loses, delays and repeats, with crashes of either end. The invariants are in
/// <see cref="LossySite"/> and <see cref="LossyJournal"/>: no answer without a charge that covers it, no round answered twice
/// with other numbers, closed rounds never change, no round asked twice, spent within the allowance, set-points within limits.
/// </summary>
public class LossyExchangeTests
{
    [Theory]
    [InlineData(0)]
    [InlineData(1)]
    [InlineData(2)]
    [InlineData(3)]
    public void Invariants_hold_on_fifty_random_plans_whatever_is_lost_late_repeated_or_killed(int kind)
    {
        Roughness[] roughness =
        [
            new(0.02, 0.05, 0.3, 0, 0),
            new(0.005, 0.2, 1.4, 0, 0.003),
            new(0, 0.02, 0.2, 0.004, 0.01),
            new(0.01, 0.1, 1, 0.01, 0.01),
        ];
        int crashes = 0, restarts = 0, repeats = 0, late = 0, closed = 0, answers = 0, setPoints = 0;
        var ends = new Dictionary<CycleEnd, int>();
        for (var i = 0; i < 50; i++)
        {
            var seed = (100 * kind) + i;
            var exchange = new LossyExchange(RandomPlan(seed), seed, roughness[kind]);
            exchange.Run();
            crashes += exchange.SiteCrashes;
            restarts += exchange.CoordinatorCrashes;
            repeats += exchange.Sites.Sum(site => site.Repeats);
            answers += exchange.Sites.Sum(site => site.AnswersSent);
            setPoints += exchange.Sites.Sum(site => site.SetPoints);
            late += exchange.Journal.LateAnswers;
            closed += exchange.Journal.Closed.Count;
            foreach (var (end, count) in exchange.Journal.Ends)
                ends[end] = ends.GetValueOrDefault(end) + count;
        }

        var howEnded = string.Join(", ", ends.Select(pair => $"{pair.Value} {pair.Key}"));
        TestContext.Current.TestOutputHelper?.WriteLine(string.Create(CultureInfo.InvariantCulture,
            $"{closed} rounds, {answers} answers, {repeats} repeated, {late} late or twice, {crashes} sites and {restarts} coordinators killed; {howEnded}"));

        // The run must have met what it is about.
        Assert.True(closed > 100 && answers > 500 && setPoints > 0 && late > 0 && repeats > 0);
        Assert.Equal(roughness[kind].SiteCrash > 0, crashes > 0);
        Assert.Equal(roughness[kind].CoordinatorCrash > 0, restarts > 0);
    }

    [Fact]
    public void The_same_seed_plays_the_same_exchange()
    {
        var rough = new Roughness(0.01, 0.1, 1, 0.01, 0.01);
        var runs = Enumerable.Range(0, 2).Select(_ =>
        {
            var exchange = new LossyExchange(RandomPlan(5), 5, rough);
            exchange.Run();
            return (exchange.SiteCrashes, exchange.CoordinatorCrashes, exchange.Journal.Closed.Count, exchange.Journal.LateAnswers);
        }).ToArray();
        Assert.Equal(runs[0], runs[1]);
    }

    private static Plan RandomPlan(int seed)
    {
        var random = new Random(seed);
        var plan = InventedPlans.Make(random.Next(3, 9), seed, random.Next(1, 3), 3);
        return plan with
        {
            Cycles = 4,
            Scheme = new SchemeSettings { Kind = random.Next(3) == 0 ? SchemeKind.Angle : SchemeKind.Injection },
            Stop = plan.Stop with { RoundCap = random.Next(20, 80) },
            Rounds = new RoundSettings { Deadline = TimeSpan.FromSeconds(2), Quorum = 0.3 + (0.5 * random.NextDouble()), HoldRounds = random.Next(0, 12) },
            Privacy = plan.Privacy with
            {
                Mechanism = random.Next(5) == 0 ? MechanismKind.None : MechanismKind.PerRound,
                Epsilon = 0.5 + (10 * random.NextDouble()),
                Scope = (PrivacyScope)random.Next(4),
            },
        };
    }
}
