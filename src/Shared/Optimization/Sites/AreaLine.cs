namespace Halfvoice.Optimization;

/// <summary>A line of a site of several buses: between two of its own buses, or a tie line to a foreign one.</summary>
/// <param name="From">Local node; flow is positive when it leaves here.</param>
/// <param name="To">Local node, other than <paramref name="From"/>; at least one end is an own bus.</param>
/// <param name="SusceptanceMwPerRad">MW per radian; may be negative (series capacitor), never zero.</param>
/// <param name="LimitMw">Largest flow in either direction, at least 0; positive infinity means no limit.</param>
public readonly record struct AreaLine(int From, int To, double SusceptanceMwPerRad, double LimitMw);
