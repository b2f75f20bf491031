using System.Numerics;

namespace Halfvoice.Privacy;

/// <summary>
/// What a site has spent, as a pure state machine: it stores nothing itself and says what to store. Its rules, argued in
/// <c>accounting.proof.md</c>: a charge precedes its answers; rounds are granted forward only and never twice; spent plus
/// reserved never passes the period's allowance; a refusal is final for its period; after a restart every reservation
/// that was not settled is forfeited in full.
/// </summary>
public sealed class ChargeBook
{
    private readonly ScopeAllowance _allowance;
    private readonly Dictionary<long, ChargeRow> _open = [];
    private readonly Dictionary<long, BigInteger> _spent = [];
    private readonly Dictionary<long, ChargeRow> _refused = [];
    private long _lastId;
    private (int Cycle, int Round) _last;

    public ChargeBook(ScopeAllowance allowance)
    {
        ArgumentNullException.ThrowIfNull(allowance);
        _allowance = allowance;
    }

    /// <summary>The last round that was granted or forfeited; (0, 0) before the first.</summary>
    public (int Cycle, int Round) LastGranted => _last;

    /// <summary>The book after a restart, with the rows that change by it.</summary>
    /// <param name="allowance">The plan's allowance now; periods are reckoned anew from it.</param>
    /// <param name="rows">Every row that the ledger holds, in any order.</param>
    /// <param name="forfeited">Reservations that were open; the host stores them before the first answer.</param>
    /// <exception cref="ArgumentException">A row is damaged or stands twice.</exception>
    public static ChargeBook Restore(ScopeAllowance allowance, IEnumerable<ChargeRow> rows, out IReadOnlyList<ChargeRow> forfeited)
    {
        ArgumentNullException.ThrowIfNull(rows);
        var book = new ChargeBook(allowance);
        var closed = new List<ChargeRow>();
        var seen = new HashSet<long>();
        foreach (var stored in rows)
        {
            stored.Validate();
            if (!seen.Add(stored.Id))
                throw new ArgumentException($"Row {stored.Id} stands twice in the ledger: it is damaged. Keep the file and stop this site's answers.");
            var row = stored.State == ChargeState.Open ? stored with { State = ChargeState.Forfeited } : stored;
            if (row != stored)
                closed.Add(row);
            book.Take(row);
        }

        forfeited = closed;
        return book;
    }

    /// <summary>Spent and reserved in the period of a cycle, in units of 1e-12.</summary>
    public BigInteger SpentUnits(int cycle) => _spent.GetValueOrDefault(_allowance.PeriodOf(cycle).Index);

    /// <summary>Answers that the period of a cycle still has room for; 0 once it has refused.</summary>
    public int AnswersLeft(int cycle)
    {
        if (_refused.ContainsKey(_allowance.PeriodOf(cycle).Index))
            return 0;
        var left = (_allowance.PeriodUnits - SpentUnits(cycle)) / _allowance.EpsilonUnitsEach;
        return (int)BigInteger.Max(0, BigInteger.Min(left, int.MaxValue));
    }

    /// <summary>Whether an answer to this round may leave: it lies in an open reservation.</summary>
    public bool Covers(int cycle, int round) => _open.Values.Any(row => row.Spans(cycle, round));

    /// <summary>Charges rounds <paramref name="firstRound"/> … + <paramref name="answers"/> − 1 of a cycle ahead.</summary>
    /// <param name="cycle">1-based.</param>
    /// <param name="firstRound">1-based.</param>
    /// <param name="answers">At least 1.</param>
    public ReserveOutcome TryReserve(int cycle, int firstRound, int answers)
    {
        ArgumentOutOfRangeException.ThrowIfLessThan(cycle, 1);
        ArgumentOutOfRangeException.ThrowIfLessThan(firstRound, 1);
        ArgumentOutOfRangeException.ThrowIfLessThan(answers, 1);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(answers, int.MaxValue - firstRound);
        if ((cycle, firstRound).CompareTo(_last) <= 0)
            return new RoundsAlreadyGranted(cycle, firstRound, _last.Cycle, _last.Round);
        var period = _allowance.PeriodOf(cycle);
        var each = _allowance.EpsilonUnitsEach;
        var row = new ChargeRow(_lastId + 1, period.Scope, period.Index, cycle, firstRound, answers, each, ChargeState.Open, 0);
        var spent = SpentUnits(cycle);
        var asked = (BigInteger)each * answers;
        if (_refused.TryGetValue(period.Index, out var refused))
            return new BudgetRefusal(refused, period, spent, asked, _allowance.PeriodUnits);
        if (spent + asked > _allowance.PeriodUnits)
        {
            row = row with { State = ChargeState.Refused };
            Take(row);
            return new BudgetRefusal(row, period, spent, asked, _allowance.PeriodUnits);
        }

        Take(row);
        return new Reservation(row);
    }

    /// <summary>
    /// Closes a reservation and frees the answers that never left. The freed ε may be reserved again once the returned
    /// row is durable.
    /// </summary>
    /// <param name="reservationId">An open reservation.</param>
    /// <param name="answersUsed">Answers that left, or may have left: 0 to the reserved number.</param>
    public ChargeRow Settle(long reservationId, int answersUsed)
    {
        var row = Opened(reservationId);
        ArgumentOutOfRangeException.ThrowIfNegative(answersUsed);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(answersUsed, row.Answers);
        _spent[Period(row)] -= (BigInteger)row.EpsilonUnitsEach * (row.Answers - answersUsed);
        return Close(row with { State = ChargeState.Settled, Used = answersUsed });
    }

    /// <summary>Closes a reservation of which it is not known what left: all of it stays charged.</summary>
    public ChargeRow Forfeit(long reservationId) => Close(Opened(reservationId) with { State = ChargeState.Forfeited });

    private ChargeRow Opened(long id) => _open.TryGetValue(id, out var row)
        ? row
        : throw new InvalidOperationException($"Reservation {id} is not open: it was closed before or never made.");

    private ChargeRow Close(ChargeRow row)
    {
        _open.Remove(row.Id);
        return row;
    }

    /// <summary>The period of a row under the allowance in force, which may be another than when it was written.</summary>
    private long Period(ChargeRow row) => _allowance.PeriodOf(row.Cycle).Index;

    private void Take(ChargeRow row)
    {
        _lastId = Math.Max(_lastId, row.Id);
        if (row.State == ChargeState.Refused)
        {
            _refused.TryAdd(Period(row), row);
            return;
        }

        var end = (row.Cycle, row.FirstRound + row.Answers - 1);
        _last = end.CompareTo(_last) > 0 ? end : _last;
        _spent[Period(row)] = _spent.GetValueOrDefault(Period(row)) + (BigInteger)row.EpsilonUnitsEach * row.ChargedAnswers;
        if (row.State == ChargeState.Open)
            _open.Add(row.Id, row);
    }
}
