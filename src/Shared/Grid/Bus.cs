namespace Halfvoice.Grid;

/// <summary>A bus and the site that answers for it.</summary>
/// <param name="Name">Unique within the plan.</param>
/// <param name="Site">The site that owns the bus.</param>
/// <param name="Label">Text for people; may be absent.</param>
/// <param name="X">East coordinate for maps, km; may be absent.</param>
/// <param name="Y">North coordinate for maps, km; may be absent.</param>
public sealed record Bus(string Name, string Site, string? Label = null, double? X = null, double? Y = null);
