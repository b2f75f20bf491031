namespace Halfvoice.Optimization;

/// <summary>What is left to say of an <see cref="AreaAngleProblem"/> once angles and outputs are in the caller's spans.</summary>
/// <param name="ShedMw">Load not served, over all own buses, MW, at least 0.</param>
/// <param name="SpiltMw">Power spilt, over all own buses, MW, at least 0.</param>
/// <param name="StationarityPerMwh">How far the answer is from stationary, $/MWh: what the proximal terms still pull.</param>
/// <param name="OuterSteps">Quadratic programs solved.</param>
public readonly record struct AreaAngleSolution(double ShedMw, double SpiltMw, double StationarityPerMwh, int OuterSteps);
