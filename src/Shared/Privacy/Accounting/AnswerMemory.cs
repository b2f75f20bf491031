namespace Halfvoice.Privacy;

/// <summary>Why a round gets no answer.</summary>
public enum RoundRefusalReason
{
    /// <summary>The round was answered to a different ask; a second answer would be a second release.</summary>
    AskChanged,

    /// <summary>The round may have been answered before a restart whose answer is not known; it never gets another.</summary>
    Forfeited,

    /// <summary>A later round was answered already, and this one was not.</summary>
    Superseded,
}

/// <summary>What to do with an ask.</summary>
public abstract record AnswerDecision;

/// <summary>Not seen before: charge it, release once, and keep the bytes before they leave.</summary>
public sealed record AnswerAfresh : AnswerDecision
{
    internal static readonly AnswerAfresh Instance = new();
}

/// <summary>Seen before with the same ask: send exactly these bytes again; it costs nothing.</summary>
public sealed record AnswerRepeated(ReadOnlyMemory<byte> Bytes) : AnswerDecision;

/// <summary>No answer to this round.</summary>
public sealed record RoundRefused(int Cycle, int Round, RoundRefusalReason Reason) : AnswerDecision;

/// <summary>
/// The answers that left lately, so that a repeated ask gets the identical bytes and never fresh noise. Holds a bounded
/// number of rounds; what is older is refused, never answered anew.
/// </summary>
public sealed class AnswerMemory
{
    private readonly int _capacity;
    private readonly SortedDictionary<(int Cycle, int Round), (AskDigest Ask, byte[] Bytes)> _kept = [];
    private (int Cycle, int Round) _forfeitedThrough;
    private (int Cycle, int Round) _lastAnswered;

    /// <param name="capacity">Rounds to keep, 1 to 100,000.</param>
    public AnswerMemory(int capacity = 64)
    {
        ArgumentOutOfRangeException.ThrowIfLessThan(capacity, 1);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(capacity, 100_000);
        _capacity = capacity;
    }

    /// <summary>Decides about an ask without changing anything.</summary>
    public AnswerDecision Look(int cycle, int round, AskDigest ask)
    {
        var key = (cycle, round);
        if (_kept.TryGetValue(key, out var kept))
            return kept.Ask == ask ? new AnswerRepeated(kept.Bytes) : new RoundRefused(cycle, round, RoundRefusalReason.AskChanged);
        if (key.CompareTo(_forfeitedThrough) <= 0)
            return new RoundRefused(cycle, round, RoundRefusalReason.Forfeited);
        if (key.CompareTo(_lastAnswered) <= 0)
            return new RoundRefused(cycle, round, RoundRefusalReason.Superseded);
        return AnswerAfresh.Instance;
    }

    /// <summary>Keeps an answer; to be called before its bytes leave, or with the bytes of an answer restored from the ledger.</summary>
    /// <exception cref="InvalidOperationException">The round was answered already, or may not be answered.</exception>
    public void Keep(int cycle, int round, AskDigest ask, ReadOnlySpan<byte> answer)
    {
        if (Look(cycle, round, ask) is not AnswerAfresh)
            throw new InvalidOperationException($"Cycle {cycle}, round {round} must not be answered afresh; ask Look first.");
        _kept.Add((cycle, round), (ask, answer.ToArray()));
        _lastAnswered = (cycle, round);
        while (_kept.Count > _capacity)
            _kept.Remove(_kept.First().Key);
    }

    /// <summary>
    /// Marks every round up to and including this one as never to be answered, save those that are kept: call it after a
    /// restart, once the kept answers are restored, with <see cref="ChargeBook.LastGranted"/>.
    /// </summary>
    public void ForfeitThrough(int cycle, int round)
    {
        if ((cycle, round).CompareTo(_forfeitedThrough) > 0)
            _forfeitedThrough = (cycle, round);
    }
}
