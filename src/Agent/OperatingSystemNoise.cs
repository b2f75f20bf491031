using System.Security.Cryptography;
using Halfvoice.Privacy;

namespace Halfvoice.Agent;

/// <summary>Randomness from the operating system's generator; the only source that an agent has. A failure is never papered over.</summary>
internal sealed class OperatingSystemNoise : INoiseSource
{
    public bool IsPrivate => true;

    public void Fill(Span<byte> bytes) => RandomNumberGenerator.Fill(bytes);
}
