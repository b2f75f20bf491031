namespace Halfvoice.Optimization;

/// <summary>A line from a one-bus site to one of its neighbours. Parallel lines name the same copy.</summary>
/// <param name="Copy">Index of the neighbour's angle copy; 0 is the site's own angle, so at least 1.</param>
/// <param name="SusceptanceMwPerRad">MW per radian; may be negative (series capacitor), never zero.</param>
/// <param name="LimitMw">Largest flow in either direction, at least 0; positive infinity means no limit.</param>
public readonly record struct NodalLine(int Copy, double SusceptanceMwPerRad, double LimitMw);
