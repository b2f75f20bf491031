using Halfvoice.Privacy;

namespace Halfvoice.Tests.Coordination;

/// <summary>A noise source that must not be read: for runs with mechanism none.</summary>
internal sealed class NoNoise : INoiseSource
{
    public bool IsPrivate => false;

    public void Fill(Span<byte> bytes) => throw new InvalidOperationException("Noise was drawn where none was asked for.");
}
