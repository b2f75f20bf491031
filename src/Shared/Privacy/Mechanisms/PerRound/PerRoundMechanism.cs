using Halfvoice.Plans;

namespace Halfvoice.Privacy;

/// <summary>
/// Mechanism <c>per-round</c>: every answer is clamped to public bounds, rounded to the lattice, and gets discrete Laplace
/// noise of its own on every coordinate. Noise is drawn ahead, used once and wiped; nothing here prints or returns it.
/// Proof: <c>per-round.proof.md</c>.
/// </summary>
public sealed class PerRoundMechanism : IAnswerMechanism, IDisposable
{
    /// <summary>Most noise vectors kept ahead.</summary>
    public const int MaxPrepared = 4096;

    private readonly NoiseCalibration _calibration;
    private readonly AnswerBounds _bounds;
    private readonly NoiseReader _noise;
    private readonly Queue<long[]> _ready = new();

    /// <param name="calibration">From the same bounds.</param>
    /// <param name="bounds">Public bounds on the answer.</param>
    /// <param name="source">In production the operating system's generator.</param>
    public PerRoundMechanism(NoiseCalibration calibration, AnswerBounds bounds, INoiseSource source)
    {
        ArgumentNullException.ThrowIfNull(calibration);
        ArgumentNullException.ThrowIfNull(bounds);
        if (calibration.Dimension != bounds.Dimension)
            throw new ArgumentException("Calibration and bounds are of different dimension.", nameof(bounds));
        _calibration = calibration;
        _bounds = bounds;
        _noise = new NoiseReader(source);
    }

    public MechanismKind Kind => MechanismKind.PerRound;

    /// <inheritdoc/>
    public bool IsPrivate => _noise.IsPrivate;

    public AnswerLattice Lattice => _calibration.Lattice;

    public int Dimension => _calibration.Dimension;

    /// <inheritdoc/>
    public int Prepared => _ready.Count;

    /// <inheritdoc/>
    public void PrepareNoise(int answers)
    {
        ArgumentOutOfRangeException.ThrowIfNegative(answers);
        ArgumentOutOfRangeException.ThrowIfGreaterThan(answers, MaxPrepared);
        while (_ready.Count < answers)
        {
            var draw = new long[Dimension];
            for (var i = 0; i < draw.Length; i++)
                draw[i] = DiscreteLaplace.Draw(_noise, _calibration.ScaleSteps);
            _ready.Enqueue(draw);
        }
    }

    /// <inheritdoc/>
    public void Release(ReadOnlySpan<double> values, Span<long> steps)
    {
        if (!_ready.TryDequeue(out var draw))
            throw new InvalidOperationException("No noise is prepared: call PrepareNoise before the ask arrives.");
        try
        {
            _bounds.Quantize(Lattice, values, steps);
            for (var i = 0; i < draw.Length; i++)
                steps[i] = AnswerLattice.Saturate(steps[i] + draw[i]);
        }
        catch
        {
            // A half-made answer must not stay behind in the caller's buffer.
            steps.Clear();
            throw;
        }
        finally
        {
            Array.Clear(draw);
        }
    }

    /// <summary>Wipes all noise that was drawn and not used.</summary>
    public void Dispose()
    {
        while (_ready.TryDequeue(out var draw))
            Array.Clear(draw);
        _noise.Dispose();
    }
}
