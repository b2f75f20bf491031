namespace Halfvoice.Wire;

/// <summary>Numbers that both ends of a stream agree on.</summary>
public static class WireContract
{
    /// <summary>Version of the protocol; another one is refused.</summary>
    public const uint Protocol = 1;

    /// <summary>Largest message either end accepts, bytes: an ask about 5,000 buses is 80 kB.</summary>
    public const int MaxMessageBytes = 1 << 20;

    /// <summary>Largest number of components in an ask or answer.</summary>
    public const int MaxComponents = 50_000;

    /// <summary>
    /// Largest noise scale that a site may declare, MW or rad: far above what any plan gives, and small enough that sums and
    /// squares over all components stay finite.
    /// </summary>
    public const double MaxNoiseScale = 1e30;

    /// <summary>
    /// Largest magnitude of a number in an ask or outcome, whatever its unit: far beyond any price, power or angle of a network, and
    /// small enough that products of a few such numbers stay finite.
    /// </summary>
    public const double MaxMagnitude = 1e18;

    /// <summary>Longest text that a peer may send, characters.</summary>
    public const int MaxText = 500;

    /// <summary>Seconds between pulses on a quiet stream.</summary>
    public const int PulseSeconds = 10;

    /// <summary>A stream that brings nothing for this long is dead, s.</summary>
    public const int DeadAfterSeconds = 45;
}
