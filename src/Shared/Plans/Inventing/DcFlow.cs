using Halfvoice.Grid;

namespace Halfvoice.Plans;

/// <summary>
/// Flows of the DC model for given injections: solves Σ_l b_l (θ_i − θ_j) = injection_i and returns f_l = b_l (θ_from − θ_to),
/// for networks that are connected and have positive reactances, as invented ones are. By conjugate gradients
/// (Hestenes and Stiefel, 1952) with an incomplete Cholesky preconditioner without fill (Meijerink and van der Vorst, 1977).
/// </summary>
internal sealed class DcFlow
{
    private readonly Network _network;
    private readonly int _buses;
    private readonly double[] _susceptance;
    private readonly double[] _diagonal;
    private readonly int[] _start;
    private readonly int[] _column;
    private readonly double[] _weight;
    private readonly double[] _pivot;

    public DcFlow(Network network)
    {
        _network = network;
        _buses = network.Buses.Count;
        _susceptance = [.. Enumerable.Range(0, network.Lines.Count).Select(network.SusceptanceMwPerRad)];
        _diagonal = new double[_buses];
        _start = new int[_buses + 1];
        for (var l = 0; l < _susceptance.Length; l++)
        {
            var line = network.Lines[l];
            _diagonal[line.FromBus] += _susceptance[l];
            _diagonal[line.ToBus] += _susceptance[l];
            _start[line.FromBus + 1]++;
            _start[line.ToBus + 1]++;
        }

        for (var bus = 0; bus < _buses; bus++)
            _start[bus + 1] += _start[bus];
        _column = new int[_start[_buses]];
        _weight = new double[_start[_buses]];
        for (var bus = 0; bus < _buses; bus++)
        {
            var at = _start[bus];
            foreach (var l in network.LinesAt(bus))
            {
                var line = network.Lines[l];
                _column[at] = line.FromBus == bus ? line.ToBus : line.FromBus;
                _weight[at++] = _susceptance[l];
            }

            Array.Sort(_column, _weight, _start[bus], at - _start[bus]);
        }

        _pivot = Factor();
    }

    /// <summary>Flow on each line, MW, positive from its first bus to its second, for injections that sum to zero.</summary>
    public double[] Flows(ReadOnlySpan<double> injectionMw, double tolerance = 1e-7)
    {
        var angle = Angles(injectionMw, tolerance);
        var flows = new double[_susceptance.Length];
        for (var l = 0; l < flows.Length; l++)
            flows[l] = _susceptance[l] * (angle[_network.Lines[l].FromBus] - angle[_network.Lines[l].ToBus]);
        return flows;
    }

    /// <summary>Change of one line's flow per MW injected at each bus and taken out wherever; only differences mean anything.</summary>
    public double[] Sensitivity(int line, double tolerance = 1e-3)
    {
        var pair = new double[_buses];
        pair[_network.Lines[line].FromBus] = _susceptance[line];
        pair[_network.Lines[line].ToBus] = -_susceptance[line];
        return Angles(pair, tolerance);
    }

    private double[] Angles(ReadOnlySpan<double> injection, double tolerance)
    {
        var x = new double[_buses];
        var residual = injection.ToArray();
        var z = new double[_buses];
        var product = new double[_buses];
        Precondition(residual, z);
        var direction = (double[])z.Clone();
        var rho = Dot(residual, z);
        var target = tolerance * tolerance * Dot(residual, residual);
        for (var step = 0; step < 20 * _buses && Dot(residual, residual) > target; step++)
        {
            Multiply(direction, product);
            var length = rho / Dot(direction, product);
            for (var i = 0; i < _buses; i++)
            {
                x[i] += length * direction[i];
                residual[i] -= length * product[i];
            }

            Precondition(residual, z);
            var next = Dot(residual, z);
            var share = next / rho;
            rho = next;
            for (var i = 0; i < _buses; i++)
                direction[i] = z[i] + (share * direction[i]);
        }

        return x;
    }

    private void Multiply(double[] x, double[] product)
    {
        for (var i = 0; i < _buses; i++)
        {
            var sum = _diagonal[i] * x[i];
            for (var k = _start[i]; k < _start[i + 1]; k++)
                sum -= _weight[k] * x[_column[k]];
            product[i] = sum;
        }
    }

    /// <summary>
    /// Pivots of M = (P + L) P⁻¹ (P + Lᵀ), L the strict lower part: p_i = d_i − Σ_{j&lt;i} w_ij² / p_j, kept away from zero.
    /// </summary>
    private double[] Factor()
    {
        var pivot = new double[_buses];
        for (var i = 0; i < _buses; i++)
        {
            var value = _diagonal[i];
            for (var k = _start[i]; k < _start[i + 1] && _column[k] < i; k++)
                value -= _weight[k] * _weight[k] / pivot[_column[k]];

            // The matrix is singular (all angles may shift together), so the last pivot would vanish.
            pivot[i] = Math.Max(value, 1e-3 * _diagonal[i]);
        }

        return pivot;
    }

    private void Precondition(double[] residual, double[] z)
    {
        for (var i = 0; i < _buses; i++)
        {
            var sum = residual[i];
            for (var k = _start[i]; k < _start[i + 1] && _column[k] < i; k++)
                sum += _weight[k] * z[_column[k]];
            z[i] = sum / _pivot[i];
        }

        for (var i = _buses - 1; i >= 0; i--)
        {
            var sum = 0.0;
            for (var k = _start[i + 1] - 1; k >= _start[i] && _column[k] > i; k--)
                sum += _weight[k] * z[_column[k]];
            z[i] += sum / _pivot[i];
        }
    }

    private static double Dot(double[] a, double[] b)
    {
        var sum = 0.0;
        for (var i = 0; i < a.Length; i++)
            sum += a[i] * b[i];
        return sum;
    }
}
