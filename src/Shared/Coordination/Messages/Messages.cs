namespace Halfvoice.Coordination;

/// <summary>What a site says when it joins: how to read its answers. All of it is public.</summary>
/// <param name="SetupDigest">Digest of the public plan data that both ends must share.</param>
/// <param name="LatticeExponent">Answers are integers; value = steps · 2^exponent (MW or rad).</param>
/// <param name="NoiseScale">Scale of the noise on one component, in the answer's unit (MW or rad); 0 without noise.</param>
/// <param name="EpsilonPerAnswer">What one answer is charged; 0 without a guarantee.</param>
/// <param name="AnsweredThrough">Last cycle and round that this site may have answered; a round up to it is never asked again.</param>
public sealed record Enrol(
    string SetupDigest,
    int LatticeExponent,
    double NoiseScale,
    double EpsilonPerAnswer,
    RoundId AnsweredThrough);

/// <summary>A round of a cycle; both count from 1. (0, 0) is before all rounds.</summary>
public readonly record struct RoundId(int Cycle, int Round) : IComparable<RoundId>
{
    public static readonly RoundId None;

    public int CompareTo(RoundId other) => Cycle != other.Cycle ? Cycle.CompareTo(other.Cycle) : Round.CompareTo(other.Round);

    public static bool operator <(RoundId left, RoundId right) => left.CompareTo(right) < 0;

    public static bool operator >(RoundId left, RoundId right) => left.CompareTo(right) > 0;

    public static bool operator <=(RoundId left, RoundId right) => left.CompareTo(right) <= 0;

    public static bool operator >=(RoundId left, RoundId right) => left.CompareTo(right) >= 0;

    public override string ToString() => $"cycle {Cycle} round {Round}";
}

/// <summary>The coordinator's reply to an enrolment.</summary>
/// <param name="NextCycle">The cycle that the site will be asked about next.</param>
public sealed record Welcome(int NextCycle);

/// <summary>
/// One ask. For scheme injection the values are z (MW) and u ($/MWh) of the site's adjustable buses; for scheme angle the
/// consensus angle (rad) and the dual ($/rad·h) of each of the site's copies.
/// </summary>
/// <param name="Everything">True where the answer must cover all of the site's components, also those that cannot move.</param>
public sealed record Ask(RoundId Id, bool Everything, double[] Consensus, double[] Dual);

/// <summary>A site's answer on its lattice.</summary>
/// <param name="Everything">Echo of the ask: whether all components are covered.</param>
public sealed record Answer(RoundId Id, bool Everything, long[] Steps);

/// <summary>Why somebody says no. Each reason is final for the round unless it says otherwise.</summary>
public enum RefusalReason
{
    Unspecified,

    /// <summary>The allowance of the period is spent; final for the period.</summary>
    BudgetSpent,

    /// <summary>The same round was asked before with other numbers.</summary>
    AskChanged,

    /// <summary>The round may have been answered before a restart and is forfeited.</summary>
    Forfeited,

    /// <summary>The round lies before one that was already answered.</summary>
    OutOfOrder,

    /// <summary>The message did not have the shape that the setup calls for.</summary>
    Malformed,

    /// <summary>A number is not finite or outside public bounds.</summary>
    OutOfRange,

    /// <summary>Protocol version or setup digest differ.</summary>
    NotOurPlan,

    /// <summary>The certificate does not belong to the site that the message names, or the role may not do this.</summary>
    WrongIdentity,

    /// <summary>Another live stream already speaks for this site.</summary>
    AlreadyJoined,

    /// <summary>The site has no load reading for the cycle.</summary>
    NoReading,
}

/// <summary>A typed 'no'. The text never holds a private value.</summary>
public sealed record Refusal(RoundId Id, RefusalReason Reason, string Text);

/// <summary>How a cycle ended.</summary>
public enum CycleEnd
{
    /// <summary>Mismatch and price move are under the limits (or the noise floor where that is higher).</summary>
    Settled,

    /// <summary>The round cap came first; the last accepted dispatch stands.</summary>
    RoundCap,

    /// <summary>Too few sites answered in time; the last accepted dispatch stands.</summary>
    NoQuorum,

    /// <summary>A site stayed away longer than its last answer may be held; the last accepted dispatch stands.</summary>
    SiteLost,

    /// <summary>The coordinator was asked to stop.</summary>
    Stopped,
}

/// <summary>The end of a cycle as told to a site: consensus and dual for each of its components (all of them), in the units of an ask.</summary>
public sealed record Outcome(int Cycle, CycleEnd End, int Rounds, double[] Consensus, double[] Dual);
