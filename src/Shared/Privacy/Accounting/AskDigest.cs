using System.Buffers.Binary;
using System.Security.Cryptography;

namespace Halfvoice.Privacy;

/// <summary>SHA-256 of an ask's canonical bytes: what makes two asks the same.</summary>
public readonly record struct AskDigest(ulong A, ulong B, ulong C, ulong D)
{
    /// <param name="askBytes">Everything of the ask that an answer depends on, in a fixed order.</param>
    public static AskDigest Of(ReadOnlySpan<byte> askBytes)
    {
        Span<byte> hash = stackalloc byte[SHA256.HashSizeInBytes];
        SHA256.HashData(askBytes, hash);
        return FromBytes(hash);
    }

    /// <param name="digest">32 bytes.</param>
    public static AskDigest FromBytes(ReadOnlySpan<byte> digest)
    {
        if (digest.Length != SHA256.HashSizeInBytes)
            throw new ArgumentException("A digest has 32 bytes.", nameof(digest));
        return new AskDigest(Word(digest, 0), Word(digest, 1), Word(digest, 2), Word(digest, 3));
    }

    /// <summary>The 32 bytes.</summary>
    public byte[] ToBytes()
    {
        var bytes = new byte[SHA256.HashSizeInBytes];
        ulong[] words = [A, B, C, D];
        for (var i = 0; i < words.Length; i++)
            BinaryPrimitives.WriteUInt64BigEndian(bytes.AsSpan(8 * i), words[i]);
        return bytes;
    }

    private static ulong Word(ReadOnlySpan<byte> bytes, int index) => BinaryPrimitives.ReadUInt64BigEndian(bytes[(8 * index)..]);
}
