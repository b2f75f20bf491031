namespace Halfvoice.Optimization;

/// <summary>One output that an area decides: a generator with some range, or load shed or power spilt at a bus.</summary>
internal readonly record struct AreaUnit(int Bus, double MinMw, double MaxMw, double CostQuadratic, double CostLinear);
