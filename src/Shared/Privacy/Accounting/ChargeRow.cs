using Halfvoice.Plans;

namespace Halfvoice.Privacy;

/// <summary>What became of a reservation.</summary>
public enum ChargeState
{
    /// <summary>Answers may leave under it.</summary>
    Open,

    /// <summary>Closed with the number of answers that left.</summary>
    Settled,

    /// <summary>Closed in full: it is not known which answers left.</summary>
    Forfeited,

    /// <summary>A refusal, kept so that it stays final across a restart; it charges nothing.</summary>
    Refused,
}

/// <summary>
/// One row of a site's ledger. The host makes a row durable before it acts on it: an open row before any answer of its
/// rounds leaves, a settled row before the freed ε is reserved again.
/// </summary>
/// <param name="Id">1, 2, 3, … in the order of reservation.</param>
/// <param name="Scope">Scope of the period.</param>
/// <param name="Period">Index of the period, see <see cref="PrivacyPeriod"/>.</param>
/// <param name="Cycle">1-based.</param>
/// <param name="FirstRound">First round covered, 1-based.</param>
/// <param name="Answers">Rounds covered, at least 1.</param>
/// <param name="EpsilonUnitsEach">Charge of one answer, in units of 1e-12.</param>
/// <param name="State">What became of it.</param>
/// <param name="Used">Answers that left; meaningful when settled.</param>
public sealed record ChargeRow(
    long Id,
    PrivacyScope Scope,
    long Period,
    int Cycle,
    int FirstRound,
    int Answers,
    long EpsilonUnitsEach,
    ChargeState State,
    int Used)
{
    /// <summary>The answers that this row charges for.</summary>
    public int ChargedAnswers => State switch
    {
        ChargeState.Settled => Used,
        ChargeState.Refused => 0,
        _ => Answers,
    };

    /// <summary>Whether a round lies in the row's span.</summary>
    public bool Spans(int cycle, int round) => cycle == Cycle && round >= FirstRound && round - FirstRound < Answers;

    internal void Validate()
    {
        var spanEnds = (long)FirstRound + Answers;
        if (Id < 1 || Cycle < 1 || FirstRound < 1 || Answers < 1 || spanEnds > int.MaxValue || EpsilonUnitsEach < 1
            || Used < 0 || Used > Answers || !Enum.IsDefined(State))
        {
            throw new ArgumentException(
                $"Row {Id} of the ledger is damaged. Keep the file, stop this site's answers "
                + "and start a new campaign once it is known what was spent.");
        }
    }
}
