using System.Numerics;
using Halfvoice.Plans;
using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

public class ChargeBookTests
{
    private static ScopeAllowance Of(PrivacyScope scope, double epsilon = 1, int rounds = 10, int cycles = 4, double hours = 12) =>
        ScopeAllowance.For(
            new PrivacySettings { Scope = scope, Epsilon = epsilon }, rounds, TimeSpan.FromHours(hours), cycles, false);

    private static ChargeRow Granted(ReserveOutcome outcome) => Assert.IsType<Reservation>(outcome).Row;

    [Fact]
    public void A_reservation_charges_ahead_and_settling_frees_what_never_left()
    {
        var book = new ChargeBook(Of(PrivacyScope.Cycle));
        var row = Granted(book.TryReserve(1, 1, 8));
        Assert.Equal(8 * EpsilonUnits.PerOne / 10, (long)book.SpentUnits(1));
        Assert.Equal(2, book.AnswersLeft(1));
        Assert.True(book.Covers(1, 8));
        Assert.False(book.Covers(1, 9));
        Assert.False(book.Covers(2, 1));
        var settled = book.Settle(row.Id, 3);
        Assert.Equal(ChargeState.Settled, settled.State);
        Assert.Equal(3, settled.ChargedAnswers);
        Assert.Equal(7, book.AnswersLeft(1));
        Assert.False(book.Covers(1, 1));
    }

    [Fact]
    public void A_refusal_names_its_period_and_is_final_for_it()
    {
        var book = new ChargeBook(Of(PrivacyScope.Cycle));
        var row = Granted(book.TryReserve(1, 1, 8));
        var refusal = Assert.IsType<BudgetRefusal>(book.TryReserve(1, 9, 3));
        Assert.Equal(new PrivacyPeriod(PrivacyScope.Cycle, 1), refusal.Period);
        Assert.Equal(ChargeState.Refused, refusal.Row.State);
        Assert.Contains("allowance of cycle 1 is used up: ε 0.8 of 1", refusal.Words);
        Assert.Contains("0.3 more was asked for", refusal.Words);
        book.Settle(row.Id, 0);
        var again = Assert.IsType<BudgetRefusal>(book.TryReserve(1, 9, 1));
        Assert.Equal(refusal.Row, again.Row);
        Assert.Equal(0, book.AnswersLeft(1));
        Granted(book.TryReserve(2, 1, 10));
    }

    [Fact]
    public void A_refusal_stays_final_across_a_restart()
    {
        var allowance = Of(PrivacyScope.Cycle);
        var refusal = Assert.IsType<BudgetRefusal>(new ChargeBook(allowance).TryReserve(1, 1, 11));
        var book = ChargeBook.Restore(allowance, [refusal.Row], out var forfeited);
        Assert.Empty(forfeited);
        Assert.IsType<BudgetRefusal>(book.TryReserve(1, 1, 1));
    }

    [Theory]
    [InlineData(1, 3)]
    [InlineData(1, 1)]
    public void A_round_is_never_granted_twice(int cycle, int round)
    {
        var book = new ChargeBook(Of(PrivacyScope.Cycle));
        var row = Granted(book.TryReserve(1, 1, 3));
        book.Settle(row.Id, 0);
        Assert.Equal(new RoundsAlreadyGranted(cycle, round, 1, 3), book.TryReserve(cycle, round, 1));
        Assert.Equal((1, 3), book.LastGranted);
    }

    [Fact]
    public void Days_and_campaigns_add_their_cycles_up()
    {
        // Two cycles a day and ten rounds a cycle: ε 1 is shared by 20 answers.
        var book = new ChargeBook(Of(PrivacyScope.Day));
        Granted(book.TryReserve(1, 1, 10));
        Granted(book.TryReserve(2, 1, 10));
        Assert.IsType<BudgetRefusal>(book.TryReserve(2, 11, 1));
        Granted(book.TryReserve(3, 1, 10));

        var campaign = new ChargeBook(Of(PrivacyScope.Campaign));
        for (var cycle = 1; cycle <= 4; cycle++)
            Granted(campaign.TryReserve(cycle, 1, 10));
        Assert.IsType<BudgetRefusal>(campaign.TryReserve(5, 1, 1));
    }

    [Fact]
    public void A_restart_forfeits_what_was_open_in_full()
    {
        var allowance = Of(PrivacyScope.Cycle);
        var before = new ChargeBook(allowance);
        var settled = before.Settle(Granted(before.TryReserve(1, 1, 4)).Id, 2);
        var open = Granted(before.TryReserve(1, 5, 4));
        var book = ChargeBook.Restore(allowance, [open, settled], out var forfeited);
        Assert.Equal(open with { State = ChargeState.Forfeited }, Assert.Single(forfeited));
        Assert.Equal(6 * EpsilonUnits.PerOne / 10, (long)book.SpentUnits(1));
        Assert.False(book.Covers(1, 5));
        Assert.IsType<RoundsAlreadyGranted>(book.TryReserve(1, 8, 1));
        Assert.Equal(3, Granted(book.TryReserve(1, 9, 4)).Id);
        Assert.Throws<InvalidOperationException>(() => book.Settle(open.Id, 0));
    }

    [Fact]
    public void A_plan_that_changes_its_scope_still_counts_what_was_spent()
    {
        var before = new ChargeBook(Of(PrivacyScope.Cycle));
        var rows = new[] { Granted(before.TryReserve(1, 1, 10)), Granted(before.TryReserve(2, 1, 10)) };
        var book = ChargeBook.Restore(Of(PrivacyScope.Day, epsilon: 1.5), rows, out _);
        Assert.Equal(2 * (BigInteger)EpsilonUnits.PerOne, book.SpentUnits(2));
        Assert.IsType<BudgetRefusal>(book.TryReserve(2, 11, 1));
    }

    [Fact]
    public void A_damaged_row_is_refused()
    {
        var allowance = Of(PrivacyScope.Cycle);
        var row = Granted(new ChargeBook(allowance).TryReserve(1, 1, 4));
        ChargeRow[] damaged =
            [row with { Used = 5 }, row with { EpsilonUnitsEach = -1 }, row with { Answers = int.MaxValue }, row with { State = (ChargeState)9 }];
        foreach (var bad in damaged)
            Assert.Throws<ArgumentException>(() => ChargeBook.Restore(allowance, [bad], out _));
        Assert.Throws<ArgumentException>(() => ChargeBook.Restore(allowance, [row, row], out _));
    }

    [Fact]
    public void Settling_more_than_was_reserved_or_twice_is_refused()
    {
        var book = new ChargeBook(Of(PrivacyScope.Cycle));
        var row = Granted(book.TryReserve(1, 1, 4));
        Assert.Throws<ArgumentOutOfRangeException>(() => book.Settle(row.Id, 5));
        Assert.Throws<ArgumentOutOfRangeException>(() => book.Settle(row.Id, -1));
        Assert.Equal(4, book.Forfeit(row.Id).ChargedAnswers);
        Assert.Throws<InvalidOperationException>(() => book.Settle(row.Id, 1));
    }

    /// <summary>
    /// Random reservations, answers, settlements, forfeits and crashes at every point, with the ledger kept as a host would
    /// keep it. What truly left never passes the allowance, and no round leaves twice.
    /// </summary>
    [Theory]
    [InlineData(PrivacyScope.Round)]
    [InlineData(PrivacyScope.Cycle)]
    [InlineData(PrivacyScope.Day)]
    [InlineData(PrivacyScope.Campaign)]
    public void No_sequence_of_events_and_crashes_spends_more_than_the_allowance(PrivacyScope scope)
    {
        for (var seed = 0; seed < 300; seed++)
            new LedgerRehearsal(Of(scope, rounds: 6), seed).Run(150);
    }
}
