using System.Buffers.Binary;
using System.Numerics;

namespace Halfvoice.Privacy;

/// <summary>
/// Not private: seeded. Replayable bytes for virtual time and tests: whoever knows the seed can subtract the noise.
/// The bytes are the keystream of the ChaCha block function with 8 rounds (Bernstein 2008, from memory), keyed by seed
/// and stream, so that streams of one seed are unrelated. Equal on every platform.
/// </summary>
public sealed class SeededNoiseSource : INoiseSource
{
    private const int BlockBytes = 64;
    private const int DoubleRounds = 4;
    private readonly uint[] _key = new uint[8];
    private readonly byte[] _block = new byte[BlockBytes];
    private ulong _counter;
    private int _next = BlockBytes;

    /// <param name="seed">The run's seed.</param>
    /// <param name="stream">Tells the consumers of one run apart, for instance a site's index.</param>
    public SeededNoiseSource(ulong seed, ulong stream = 0)
    {
        var state = seed;
        for (var i = 0; i < 4; i++)
            Set(i, SplitMix(ref state) ^ (i < 2 ? 0 : SplitMixOf(stream + (ulong)i)));
    }

    /// <inheritdoc/>
    public bool IsPrivate => false;

    /// <inheritdoc/>
    public void Fill(Span<byte> bytes)
    {
        while (!bytes.IsEmpty)
        {
            if (_next == BlockBytes)
                NextBlock();
            var count = Math.Min(bytes.Length, BlockBytes - _next);
            _block.AsSpan(_next, count).CopyTo(bytes);
            bytes = bytes[count..];
            _next += count;
        }
    }

    private void Set(int pair, ulong value)
    {
        _key[2 * pair] = (uint)value;
        _key[2 * pair + 1] = (uint)(value >> 32);
    }

    private void NextBlock()
    {
        Span<uint> start = [0x61707865, 0x3320646e, 0x79622d32, 0x6b206574, .. _key, (uint)_counter, (uint)(_counter >> 32), 0, 0];
        Span<uint> x = stackalloc uint[16];
        start.CopyTo(x);
        for (var i = 0; i < DoubleRounds; i++)
        {
            Quarter(x, 0, 4, 8, 12);
            Quarter(x, 1, 5, 9, 13);
            Quarter(x, 2, 6, 10, 14);
            Quarter(x, 3, 7, 11, 15);
            Quarter(x, 0, 5, 10, 15);
            Quarter(x, 1, 6, 11, 12);
            Quarter(x, 2, 7, 8, 13);
            Quarter(x, 3, 4, 9, 14);
        }

        for (var i = 0; i < 16; i++)
            BinaryPrimitives.WriteUInt32LittleEndian(_block.AsSpan(4 * i), x[i] + start[i]);
        _counter++;
        _next = 0;
    }

    private static void Quarter(Span<uint> x, int a, int b, int c, int d)
    {
        x[d] = BitOperations.RotateLeft(x[d] ^ (x[a] += x[b]), 16);
        x[b] = BitOperations.RotateLeft(x[b] ^ (x[c] += x[d]), 12);
        x[d] = BitOperations.RotateLeft(x[d] ^ (x[a] += x[b]), 8);
        x[b] = BitOperations.RotateLeft(x[b] ^ (x[c] += x[d]), 7);
    }

    private static ulong SplitMixOf(ulong value) => SplitMix(ref value);

    /// <summary>Spreads a seed over 64 bits (Steele, Lea and Flood 2014, from memory).</summary>
    private static ulong SplitMix(ref ulong state)
    {
        var z = state += 0x9E3779B97F4A7C15;
        z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9;
        z = (z ^ (z >> 27)) * 0x94D049BB133111EB;
        return z ^ (z >> 31);
    }
}
