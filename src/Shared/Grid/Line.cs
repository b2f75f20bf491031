namespace Halfvoice.Grid;

/// <summary>A line or transformer in the DC model: flow = base_mva · (θ_from − θ_to) / reactance_pu, in MW.</summary>
/// <param name="Name">Unique within the plan.</param>
/// <param name="FromBus">Index into <see cref="Network.Buses"/>.</param>
/// <param name="ToBus">Index into <see cref="Network.Buses"/>; never equal to <paramref name="FromBus"/>.</param>
/// <param name="ReactancePu">Per unit on the plan's base; may be negative (series capacitor), never zero.</param>
/// <param name="LimitMw">Largest flow in either direction; positive infinity means no limit.</param>
/// <param name="ResistancePu">Kept for later use; the DC model ignores it.</param>
/// <param name="EmergencyLimitMw">Short-term limit; absent means the normal limit.</param>
public sealed record Line(
    string Name,
    int FromBus,
    int ToBus,
    double ReactancePu,
    double LimitMw = double.PositiveInfinity,
    double? ResistancePu = null,
    double? EmergencyLimitMw = null);
