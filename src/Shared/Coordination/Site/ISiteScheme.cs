namespace Halfvoice.Coordination;

/// <summary>
/// A site's half of a scheme: exact answers from its own loads and plants. What comes out of here is private; only the
/// privacy mechanism turns it into something that may leave.
/// </summary>
public interface ISiteScheme
{
    /// <summary>Components of a full answer.</summary>
    int ComponentCount { get; }

    /// <summary>Components that move within a cycle, as indices into a full answer.</summary>
    IReadOnlyList<int> Adjustable { get; }

    /// <summary>Public bound on every component, MW or rad.</summary>
    double Bound { get; }

    /// <summary>Solves the site problem.</summary>
    /// <param name="loadMw">Loads of the own buses, MW.</param>
    /// <param name="ask">Checked: one consensus and one dual for each adjustable component.</param>
    /// <param name="values">All components of the exact answer, MW or rad.</param>
    void Solve(ReadOnlySpan<double> loadMw, Ask ask, Span<double> values);

    /// <summary>What each plant would run at after a cycle, MW, in the order of the setup's generators.</summary>
    void Dispatch(ReadOnlySpan<double> loadMw, Outcome outcome, Span<double> outputMw);
}
