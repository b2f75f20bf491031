using System.Security.Cryptography;

namespace Halfvoice.Agent;

/// <summary>
/// How long to wait before dialling again: doubling from a quarter of a second to ten, each wait drawn evenly between half
/// of that and all of it, so that many sites do not return at once.
/// </summary>
internal sealed class Backoff
{
    private const int FirstMs = 250;
    private const int MostMs = 10_000;

    private int _nextMs = FirstMs;

    public TimeSpan Next()
    {
        var wait = RandomNumberGenerator.GetInt32(_nextMs / 2, _nextMs + 1);
        _nextMs = Math.Min(MostMs, 2 * _nextMs);
        return TimeSpan.FromMilliseconds(wait);
    }

    /// <summary>A welcome shows that the way is clear again.</summary>
    public void Reset() => _nextMs = FirstMs;
}
