namespace Halfvoice.Privacy;

/// <summary>The one rule on <c>adjacency_mw</c>.</summary>
internal static class Adjacency
{
    internal static void Check(double adjacencyMw)
    {
        if (!(adjacencyMw > 0) || !double.IsFinite(adjacencyMw))
            throw new ArgumentOutOfRangeException(nameof(adjacencyMw), "privacy.adjacency_mw must be above 0 and finite.");
    }
}
