using System.Numerics;
using System.Security.Cryptography;

namespace Halfvoice.Privacy;

/// <summary>
/// Turns bytes of a noise source into exact uniform integers. It reads the source in blocks, because a call to the
/// operating system for each byte costs more than the draw, and wipes every byte as it is used.
/// Not safe for use by two threads at once.
/// </summary>
public sealed class NoiseReader : IDisposable
{
    /// <summary>Rejections in a row after which the source counts as broken; a sound one gets there with probability below 2⁻²⁵⁶.</summary>
    private const int MaxRejections = 256;

    private readonly INoiseSource _source;
    private readonly byte[] _buffer;
    private int _next;

    /// <param name="source">Where the bytes come from.</param>
    /// <param name="blockBytes">Bytes asked for at once, 8 to 65,536.</param>
    public NoiseReader(INoiseSource source, int blockBytes = 1024)
    {
        ArgumentNullException.ThrowIfNull(source);
        ArgumentOutOfRangeException.ThrowIfLessThan(blockBytes, 8);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(blockBytes, 65_536);
        _source = source;
        _buffer = new byte[blockBytes];
        _next = blockBytes;
    }

    /// <summary>Whether the source behind this reader is private.</summary>
    public bool IsPrivate => _source.IsPrivate;

    /// <summary>A uniform integer in [0, <paramref name="exclusive"/>), by rejection and never by a remainder.</summary>
    /// <param name="exclusive">1 to 2⁶².</param>
    public long Below(long exclusive)
    {
        ArgumentOutOfRangeException.ThrowIfLessThan(exclusive, 1);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(exclusive, 1L << 62);
        if (exclusive == 1)
            return 0;
        var bits = 64 - BitOperations.LeadingZeroCount((ulong)(exclusive - 1));
        var mask = (1UL << bits) - 1;
        for (var attempt = 0; attempt < MaxRejections; attempt++)
        {
            var value = (long)(Next((bits + 7) / 8) & mask);
            if (value < exclusive)
                return value;
        }

        throw StuckSource();
    }

    /// <summary>A fair coin.</summary>
    public bool Bit() => (Next(1) & 1) == 1;

    /// <summary>Forgets the bytes read ahead.</summary>
    public void Wipe()
    {
        CryptographicOperations.ZeroMemory(_buffer);
        _next = _buffer.Length;
    }

    /// <summary>Wipes the bytes read ahead; the source is not owned.</summary>
    public void Dispose() => Wipe();

    internal static InvalidOperationException StuckSource() =>
        new("The noise source repeats itself: no answer may be released with it. Check the random generator of this machine.");

    private ulong Next(int bytes)
    {
        if (_buffer.Length - _next < bytes)
        {
            _source.Fill(_buffer);
            _next = 0;
        }

        ulong value = 0;
        for (var i = 0; i < bytes; i++)
        {
            value = (value << 8) | _buffer[_next];
            _buffer[_next++] = 0;
        }

        return value;
    }
}
