using Halfvoice.Plans;

namespace Halfvoice.Privacy;

/// <summary>
/// Mechanism <c>none</c>: the answer itself, rounded to a fine lattice. It protects nothing, must be asked for by name,
/// and is announced wherever results are shown.
/// </summary>
public sealed class NoNoiseMechanism : IAnswerMechanism
{
    private readonly AnswerBounds _bounds;

    /// <param name="lattice"><see cref="AnswerLattice.NoiselessMw"/> or <see cref="AnswerLattice.NoiselessRad"/>.</param>
    /// <param name="bounds">Public bounds, within ±2⁵² steps of the lattice.</param>
    public NoNoiseMechanism(AnswerLattice lattice, AnswerBounds bounds)
    {
        ArgumentNullException.ThrowIfNull(bounds);
        Lattice = lattice;
        _bounds = bounds;
    }

    public MechanismKind Kind => MechanismKind.None;

    /// <inheritdoc/>
    public bool IsPrivate => false;

    public AnswerLattice Lattice { get; }

    public int Dimension => _bounds.Dimension;

    /// <summary>There is none to prepare, so an answer is always ready.</summary>
    public int Prepared => int.MaxValue;

    /// <inheritdoc/>
    public void PrepareNoise(int answers) => ArgumentOutOfRangeException.ThrowIfNegative(answers);

    /// <inheritdoc/>
    public void Release(ReadOnlySpan<double> values, Span<long> steps) => _bounds.Quantize(Lattice, values, steps);
}
