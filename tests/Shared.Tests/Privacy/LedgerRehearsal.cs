using System.Numerics;
using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

/// <summary>A host that keeps a ledger in memory, crashes at random instants and counts what truly left.</summary>
internal sealed class LedgerRehearsal(ScopeAllowance allowance, int seed)
{
    private readonly Random _random = new(seed);
    private readonly Dictionary<long, ChargeRow> _durable = [];
    private readonly HashSet<(int, int)> _left = [];
    private readonly Dictionary<long, BigInteger> _leftUnits = [];
    private readonly Dictionary<long, HashSet<int>> _usedRounds = [];
    private readonly HashSet<long> _refusedPeriods = [];
    private ChargeBook _book = new(allowance);
    private int _cycle = 1;
    private int _round = 1;

    internal void Run(int events)
    {
        for (var i = 0; i < events; i++)
        {
            switch (_random.Next(8))
            {
                case 0 or 1: Reserve(); break;
                case 2 or 3 or 4: Answer(); break;
                case 5: Close(); break;
                case 6: Move(); break;
                default: Crash(); break;
            }

            Check();
        }
    }

    private void Reserve()
    {
        var outcome = _book.TryReserve(_cycle, Math.Max(1, _round + _random.Next(-2, 3)), _random.Next(1, 5));
        if (outcome is BudgetRefusal refusal)
        {
            _durable[refusal.Row.Id] = refusal.Row;
            _refusedPeriods.Add(refusal.Period.Index);
        }

        if (outcome is not Reservation reservation)
            return;
        Assert.DoesNotContain(allowance.PeriodOf(_cycle).Index, _refusedPeriods);

        // The crash may come before the row is durable; then nothing may have left, and nothing has.
        if (_random.Next(6) == 0)
            Restart();
        else
            _durable[reservation.Row.Id] = reservation.Row;
    }

    private void Answer()
    {
        _round++;
        if (!_book.Covers(_cycle, _round) || _left.Contains((_cycle, _round)))
            return;
        var row = _durable.Values.Single(r => r.State == ChargeState.Open && r.Spans(_cycle, _round));
        Assert.True(_left.Add((_cycle, _round)));
        var period = allowance.PeriodOf(_cycle).Index;
        _leftUnits[period] = _leftUnits.GetValueOrDefault(period) + row.EpsilonUnitsEach;
        if (!_usedRounds.TryGetValue(row.Id, out var rounds))
            _usedRounds[row.Id] = rounds = [];
        rounds.Add(_round);
    }

    private void Close()
    {
        var open = _durable.Values.Where(row => row.State == ChargeState.Open).ToArray();
        if (open.Length == 0)
            return;
        var row = open[_random.Next(open.Length)];
        var used = _usedRounds.TryGetValue(row.Id, out var rounds) ? rounds.Count : 0;
        var closed = _random.Next(3) == 0 ? _book.Forfeit(row.Id) : _book.Settle(row.Id, used);

        // A crash before the settled row is durable leaves the open one, which is forfeited.
        if (_random.Next(6) == 0)
            Restart();
        else
            _durable[row.Id] = closed;
    }

    private void Move()
    {
        _cycle += _random.Next(2);
        _round = _random.Next(3) == 0 ? 0 : _round;
    }

    private void Crash() => Restart();

    private void Restart()
    {
        _book = ChargeBook.Restore(allowance, _durable.Values.OrderBy(_ => _random.Next()), out var forfeited);
        foreach (var row in forfeited)
            _durable[row.Id] = row;
        Assert.DoesNotContain(_durable.Values, row => row.State == ChargeState.Open);
    }

    private void Check()
    {
        foreach (var (period, units) in _leftUnits)
            Assert.True(units <= allowance.PeriodUnits, $"Period {period} spent more than its allowance.");
        var spent = _book.SpentUnits(_cycle);
        Assert.True(spent <= allowance.PeriodUnits);
        Assert.True(_leftUnits.GetValueOrDefault(allowance.PeriodOf(_cycle).Index) <= spent);
    }
}
