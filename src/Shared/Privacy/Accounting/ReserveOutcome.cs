using System.Numerics;

namespace Halfvoice.Privacy;

/// <summary>What came of asking for answers to be charged.</summary>
public abstract record ReserveOutcome;

/// <summary>
/// Granted. The host makes <paramref name="Row"/> durable first; only then may an answer of its rounds leave.
/// </summary>
public sealed record Reservation(ChargeRow Row) : ReserveOutcome;

/// <summary>The allowance does not cover it. Final for the period; the host keeps <paramref name="Row"/> so that it stays final.</summary>
/// <param name="Row">The refusal as a ledger row: the same one for every refusal of a period.</param>
/// <param name="Period">The period whose allowance is used up.</param>
/// <param name="SpentUnits">Spent and reserved so far, units of 1e-12.</param>
/// <param name="AskedUnits">What was asked for.</param>
/// <param name="AllowanceUnits">What the period may spend.</param>
public sealed record BudgetRefusal(
    ChargeRow Row, PrivacyPeriod Period, BigInteger SpentUnits, BigInteger AskedUnits, BigInteger AllowanceUnits) : ReserveOutcome
{
    /// <summary>The refusal in words.</summary>
    public string Words =>
        $"The privacy allowance of {Period} is used up: ε {EpsilonUnits.ToDecimal(SpentUnits)} of "
        + $"{EpsilonUnits.ToDecimal(AllowanceUnits)} is spent or reserved, {EpsilonUnits.ToDecimal(AskedUnits)} more was asked for. "
        + "No answer is given until the next period.";
}

/// <summary>The rounds lie at or before one that was already granted or forfeited; rounds are granted forward only.</summary>
public sealed record RoundsAlreadyGranted(int Cycle, int FirstRound, int LastCycle, int LastRound) : ReserveOutcome;
