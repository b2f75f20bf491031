using Halfvoice.Plans;

namespace Halfvoice.Privacy;

/// <summary>
/// One period of an allowance. Index: the cycle for scopes round and cycle, the day for scope day, 1 for scope campaign.
/// A day is a day's worth of cycles, counted from the campaign's first cycle and not from a wall clock, which could be set back.
/// </summary>
public readonly record struct PrivacyPeriod(PrivacyScope Scope, long Index)
{
    public override string ToString() => Scope switch
    {
        PrivacyScope.Campaign => "the campaign",
        PrivacyScope.Day => $"day {Index}",
        _ => $"cycle {Index}",
    };
}
