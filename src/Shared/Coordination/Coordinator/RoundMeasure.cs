namespace Halfvoice.Coordination;

/// <summary>How far a round was from settled.</summary>
/// <param name="MismatchMw">Σ |answer − consensus| over adjustable components, MW (mean over the window where there is noise).</param>
/// <param name="PriceMovePerMwh">Largest price that the consensus moved by, $/MWh a round.</param>
/// <param name="MismatchFloorMw">What noise alone leaves of the mismatch at the round cap; 0 without noise.</param>
/// <param name="PriceFloorPerMwh">What noise alone leaves of the price move at the round cap; 0 without noise.</param>
/// <param name="Window">Rounds that the figures are averaged over; 1 without noise.</param>
public readonly record struct RoundMeasure(
    double MismatchMw, double PriceMovePerMwh, double MismatchFloorMw, double PriceFloorPerMwh, int Window);
