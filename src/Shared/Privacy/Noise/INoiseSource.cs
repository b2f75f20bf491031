namespace Halfvoice.Privacy;

/// <summary>
/// Where random bytes come from. The Agent passes the operating system's generator in; virtual time and tests pass a
/// seeded one, and everything that a seeded one touches says "not private: seeded".
/// </summary>
public interface INoiseSource
{
    /// <summary>True only for a source whose bytes nobody can foretell; false for every seeded source.</summary>
    bool IsPrivate { get; }

    /// <summary>Fills the whole span with independent uniform bytes.</summary>
    void Fill(Span<byte> bytes);
}
