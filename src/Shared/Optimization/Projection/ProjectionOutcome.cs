namespace Halfvoice.Optimization;

/// <summary>How a projection ended.</summary>
/// <param name="ActiveLines">Lines held at their limit.</param>
/// <param name="Relaxed">True when balance and limits cannot be met with the fixed injections, so that power was left out or thrown away.</param>
/// <param name="UnservedMw">Total of that power, MW; 0 when not relaxed.</param>
/// <param name="Steps">Lines taken in or dropped in this call: what it cost beyond the closed form.</param>
/// <param name="Converged">False only if the relaxed problem missed its tolerances; the result is then the best point met.</param>
public readonly record struct ProjectionOutcome(int ActiveLines, bool Relaxed, double UnservedMw, int Steps, bool Converged);
