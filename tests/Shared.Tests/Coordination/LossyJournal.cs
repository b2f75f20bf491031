using Halfvoice.Coordination;

namespace Halfvoice.Tests.Coordination;

/// <summary>The coordinator's journal, checked as it grows; it outlives every coordinator.</summary>
internal sealed class LossyJournal
{
    private readonly CoordinatorSetup _setup;
    private readonly HashSet<RoundId> _closed = [];
    private readonly HashSet<int> _cyclesClosed = [];
    private readonly HashSet<(int Site, RoundId Id)> _asked = [];

    public LossyJournal(CoordinatorSetup setup) => _setup = setup;

    /// <summary>What a coordinator goes on from; null before the first ask.</summary>
    public (RoundId Id, bool CycleClosed, CoordinatorState State)? Last { get; private set; }

    public IReadOnlyCollection<RoundId> Closed => _closed;

    public int LateAnswers { get; private set; }

    public Dictionary<CycleEnd, int> Ends { get; } = [];

    public void Store(JournalEntry entry)
    {
        switch (entry)
        {
            case JournalEntry.RoundAsked asked:
                Assert.InRange(asked.Id.Round, 1, _setup.RoundCap);
                Assert.True(Last is not { } last || asked.Id > last.Id, "A round was asked that lies before one already asked.");
                foreach (var (site, ask) in asked.Asks)
                {
                    Assert.Equal(asked.Id, ask.Id);
                    Assert.True(_asked.Add((site, asked.Id)), "A site was asked twice for a round.");
                }

                Last = (asked.Id, false, asked.State);
                break;
            case JournalEntry.RoundClosed closed:
                Assert.Equal(Last!.Value.Id, closed.Id);
                Assert.True(_closed.Add(closed.Id), "A round was closed twice.");
                CheckRound(closed);
                break;
            case JournalEntry.CycleClosed closed:
                Assert.True(_cyclesClosed.Add(closed.Cycle), "A cycle was closed twice.");
                Assert.True(closed.Rounds <= _setup.RoundCap);
                Last = (new RoundId(closed.Cycle, closed.Rounds), true, closed.State);
                Ends[closed.End] = Ends.GetValueOrDefault(closed.End) + 1;
                break;
            case JournalEntry.Refused { BySite: false, Refusal.Reason: RefusalReason.OutOfOrder }:
                LateAnswers++;
                break;
            default:
                break;
        }
    }

    /// <summary>Every site counts once, as heard or as held, and only where it was asked; at least the quorum was heard.</summary>
    private void CheckRound(JournalEntry.RoundClosed closed)
    {
        var heard = closed.Answers.Select(answer => answer.Site).ToArray();
        Assert.Equal(heard.Length + closed.Held.Count, heard.Concat(closed.Held).Distinct().Count());
        Assert.All(heard, site => Assert.Contains((site, closed.Id), _asked));
        Assert.All(closed.Answers, answer => Assert.Equal(closed.Id, answer.Answer.Id));
        Assert.True(heard.Length >= (_setup.Quorum * (heard.Length + closed.Held.Count)) - 1e-9, "A round closed without its quorum.");
    }
}
