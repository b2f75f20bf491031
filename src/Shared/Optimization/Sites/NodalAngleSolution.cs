namespace Halfvoice.Optimization;

/// <summary>The exact answer of a <see cref="NodalAngleProblem"/>; the angles are written to the caller's span.</summary>
/// <param name="PricePerMwh">Multiplier of the balance, $/MWh, within plus or minus the price of unserved load.</param>
/// <param name="OutputMw">Total output of the site's generators, MW.</param>
/// <param name="UnservedMw">Load shed (positive) or power spilled (negative), MW; 0 when the balance closes by itself.</param>
public readonly record struct NodalAngleSolution(double PricePerMwh, double OutputMw, double UnservedMw);
