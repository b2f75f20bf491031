namespace Halfvoice.Coordination;

/// <summary>
/// Follows answers and consensus through a cycle and measures what is left to agree on. Without noise a round speaks for
/// itself. With noise one round says little, so residuals are averaged component by component over the last half of the
/// rounds: what is noise shrinks with the window, what is disagreement stays. All of it is post-processing of released
/// values.
/// </summary>
/// <remarks>
/// Noise floor. Summed over m rounds the residuals telescope: u grows by ρ (x̂ − z) each round, so the mean residual is the
/// change of u over m rounds divided by ρ m, and the mean price move is the change of z likewise. Once a cycle has settled, u
/// and z only fluctuate, with a spread of the order of one answer's noise, so both means fall like 1/m. The floors are those
/// of the round cap's window, m = half the cap: what averaging could reach at best. Constants: Σ over components of 1.13 b
/// (mean absolute value of a difference of two near-normal values of scale b, halved) plus two standard deviations, and the
/// tail ρ b (ln N + 2) of the largest of N; both times 1.5 for what relaxation and projection add. A test holds the floors to
/// being met at the cap by at least 95 % of settled cycles.
/// </remarks>
public sealed class ConvergenceTrail
{
    private const double NoiseGain = 1.5;

    private readonly ComponentMap _map;
    private readonly List<double[]> _residual = [];
    private readonly List<double[]> _consensus = [];
    private readonly List<double[]> _dual = [];
    private double _floorMw;
    private double _priceFloor;
    private bool _noisy;
    private int _rounds;

    public ConvergenceTrail(ComponentMap map) => _map = map;

    private int Window => Math.Max(1, (_rounds + 1) / 2);

    /// <summary>Starts a cycle.</summary>
    /// <param name="noiseScale">Declared noise scale by component, MW or rad.</param>
    /// <param name="roundCap">Most rounds of the cycle.</param>
    public void Begin(ReadOnlySpan<double> noiseScale, int roundCap)
    {
        _rounds = 0;
        _residual.Clear();
        _consensus.Clear();
        _dual.Clear();
        double sum = 0, squares = 0, price = 0;
        var count = 0;
        for (var k = 0; k < noiseScale.Length; k++)
        {
            if (!_map.Adjustable[k] || noiseScale[k] == 0)
                continue;
            var scaleMw = noiseScale[k] * _map.MwPerUnit[k];
            sum += scaleMw;
            squares += scaleMw * scaleMw;
            price = Math.Max(price, _map.Penalty[k] * noiseScale[k] / _map.MwPerUnit[k]);
            count++;
        }

        _noisy = count > 0;
        var m = (roundCap + 1) / 2;
        _floorMw = NoiseGain * ((1.13 * sum) + (2 * 0.85 * Math.Sqrt(squares))) / m;
        _priceFloor = NoiseGain * price * (Math.Log(Math.Max(1, count)) + 2) / m;
    }

    /// <summary>Adds a closed round.</summary>
    public RoundMeasure Add(ReadOnlySpan<double> value, ReadOnlySpan<double> consensus, ReadOnlySpan<double> before, ReadOnlySpan<double> dual)
    {
        _rounds++;
        if (!_noisy)
            return new RoundMeasure(Mismatch(value, consensus), PriceMove(consensus, before, 1), 0, 0, 1);
        Keep(value, consensus, before, dual);
        var m = Window;
        double mismatch = 0;
        var now = _residual[_rounds];
        var then = _residual[_rounds - m];
        for (var k = 0; k < now.Length; k++)
            mismatch += Math.Abs(now[k] - then[k]) / m;
        var move = PriceMove(consensus, ConsensusAt(_rounds - m), m);
        return new RoundMeasure(mismatch, move, _floorMw, _priceFloor, m);
    }

    /// <summary>Mean consensus and dual over the window; the last ones without noise.</summary>
    public (double[] Consensus, double[] Dual) Mean(double[] consensus, double[] dual)
    {
        if (!_noisy || _rounds == 0)
            return ([.. consensus], [.. dual]);
        return (MeanOf(_consensus), MeanOf(_dual));
    }

    private double Mismatch(ReadOnlySpan<double> value, ReadOnlySpan<double> consensus)
    {
        double sum = 0;
        for (var k = 0; k < value.Length; k++)
        {
            if (_map.Adjustable[k])
                sum += Math.Abs(value[k] - consensus[k]) * _map.MwPerUnit[k];
        }

        return sum;
    }

    private double PriceMove(ReadOnlySpan<double> consensus, ReadOnlySpan<double> before, int rounds)
    {
        double largest = 0;
        for (var k = 0; k < consensus.Length; k++)
        {
            if (_map.Adjustable[k])
                largest = Math.Max(largest, _map.Penalty[k] * Math.Abs(consensus[k] - before[k]) / _map.MwPerUnit[k]);
        }

        return largest / rounds;
    }

    /// <summary>Consensus after a round of this cycle; index 0 is what the cycle started from.</summary>
    private double[] ConsensusAt(int round)
    {
        var later = _consensus[round + 1];
        var earlier = _consensus[round];
        var at = new double[later.Length];
        for (var k = 0; k < at.Length; k++)
            at[k] = later[k] - earlier[k];
        return at;
    }

    /// <summary>Running sums, so that a window's mean is one subtraction. Row r + 1 − row r is the value after round r.</summary>
    private void Keep(ReadOnlySpan<double> value, ReadOnlySpan<double> consensus, ReadOnlySpan<double> before, ReadOnlySpan<double> dual)
    {
        if (_residual.Count == 0)
        {
            _residual.Add(new double[value.Length]);
            _consensus.Add(new double[value.Length]);
            _consensus.Add(before.ToArray());
            _dual.Add(new double[value.Length]);
        }

        var residual = (double[])_residual[^1].Clone();
        var sum = (double[])_consensus[^1].Clone();
        var duals = (double[])_dual[^1].Clone();
        for (var k = 0; k < residual.Length; k++)
        {
            if (_map.Adjustable[k])
                residual[k] += (value[k] - consensus[k]) * _map.MwPerUnit[k];
            sum[k] += consensus[k];
            duals[k] += dual[k];
        }

        _residual.Add(residual);
        _consensus.Add(sum);
        _dual.Add(duals);
    }

    private double[] MeanOf(List<double[]> sums)
    {
        var m = Window;
        var last = sums[^1];
        var first = sums[^(m + 1)];
        var mean = new double[last.Length];
        for (var k = 0; k < mean.Length; k++)
            mean[k] = (last[k] - first[k]) / m;
        return mean;
    }
}
