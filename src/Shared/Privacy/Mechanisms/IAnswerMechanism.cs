using Halfvoice.Plans;

namespace Halfvoice.Privacy;

/// <summary>
/// The last thing that happens to an answer before it leaves a site: real values in, lattice steps out. One instance
/// serves one site and one kind of answer; not safe for use by two threads at once.
/// </summary>
public interface IAnswerMechanism
{
    MechanismKind Kind { get; }

    /// <summary>False where the noise could be foretold (a seeded source) or where there is none.</summary>
    bool IsPrivate { get; }

    AnswerLattice Lattice { get; }

    int Dimension { get; }

    /// <summary>Noise vectors drawn and not yet used.</summary>
    int Prepared { get; }

    /// <summary>
    /// Draws noise until <paramref name="answers"/> vectors are ready. Called before an ask arrives, so that the time an
    /// answer takes does not depend on its noise.
    /// </summary>
    void PrepareNoise(int answers);

    /// <summary>
    /// One release. Every call is a release of its own and must be charged before; a repeated ask is served from
    /// <see cref="AnswerMemory"/> and never from here.
    /// </summary>
    /// <param name="values">The exact answer: finite, of the mechanism's dimension. Private.</param>
    /// <param name="steps">Receives the released answer, of the same length.</param>
    /// <exception cref="InvalidOperationException">No noise was prepared.</exception>
    void Release(ReadOnlySpan<double> values, Span<long> steps);
}
