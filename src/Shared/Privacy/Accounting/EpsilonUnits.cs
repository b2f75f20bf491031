using System.Numerics;

namespace Halfvoice.Privacy;

/// <summary>
/// ε as whole units of 1e-12, so that a ledger adds up exactly. Allowances are rounded down into units, charges up.
/// </summary>
public static class EpsilonUnits
{
    /// <summary>Units in ε = 1.</summary>
    public const long PerOne = 1_000_000_000_000;

    /// <summary>Largest allowance of a plan, ε = 1000.</summary>
    public const double MaxEpsilon = 1000;

    /// <summary>
    /// An allowance as the plan states it, in units, rounded down. The decimal that the plan's author wrote is recovered
    /// from the double (15 significant digits) before anything is rounded.
    /// </summary>
    /// <param name="epsilon">Above 0, at most 1000.</param>
    public static long Allowance(double epsilon)
    {
        if (!(epsilon > 0) || epsilon > MaxEpsilon)
            throw new ArgumentOutOfRangeException(nameof(epsilon), "privacy.epsilon must be above 0 and at most 1000.");
        return (long)decimal.Floor((decimal)epsilon * PerOne);
    }

    /// <summary>A charge in units, rounded up.</summary>
    public static BigInteger Charge(ExactFraction epsilon) => (epsilon * PerOne).Ceiling();

    /// <summary>Units as a decimal number, exactly.</summary>
    public static decimal ToDecimal(BigInteger units) => (decimal)units / PerOne;
}
