using Halfvoice.Grid;

namespace Halfvoice.Optimization;

/// <summary>
/// Least-cost use of blocks of power on a network in the DC model: min Σ price·s + slope/2·s² subject to balance at every
/// bus, |flow| ≤ limit, lower ≤ s ≤ upper. Interior-point method on a sparse quasi-definite factorisation, then
/// a polish to the exact active set. The analysis of the grid is done once, in the constructor; solving is thread-safe.
/// </summary>
public sealed class NetworkProgram
{
    private const double HopefulError = 1e-5;
    private const double LeastTolerance = 1e-13;

    private readonly GridGraph _graph;

    /// <summary>Analyses a network; its generators play no part.</summary>
    /// <exception cref="ArgumentException">A reactance is zero or not finite, or a limit is negative.</exception>
    public NetworkProgram(Network network)
        : this(new GridGraph(network))
    {
    }

    internal NetworkProgram(GridGraph graph) => _graph = graph;

    internal GridGraph Graph => _graph;

    /// <summary>Solves for given blocks and demands (MW by bus, negative allowed).</summary>
    /// <exception cref="ArgumentException">A block or demand is out of range; the message names it by index.</exception>
    public NetworkSolution Solve(ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw, OptimumOptions? options = null)
    {
        options ??= new OptimumOptions();
        options.Check();
        Check(blocks, demandMw);
        var program = new ScaledProgram(_graph, blocks, demandMw);
        var kkt = new KktSystem(program);
        var method = new InteriorPoint(program, kkt, options);
        Polish? polish = null;
        for (var tolerance = options.Tolerance; ; tolerance *= 0.01)
        {
            var reached = method.Run(tolerance);
            if (method.BestError < HopefulError)
            {
                polish ??= new Polish(program, kkt);
                if (polish.Run(method.Best))
                {
                    var exact = SolutionReader.Read(program, blocks, demandMw, polish.Point, method.Iterations);
                    if (exact.Converged)
                        return exact;
                }
            }

            // Near a degenerate optimum slack and multiplier part only later: go on a little and look again.
            if (!reached || tolerance < LeastTolerance)
                break;
        }

        return SolutionReader.Read(program, blocks, demandMw, method.Best, method.Iterations);
    }

    /// <summary>
    /// As <see cref="Solve"/>, but any load may be left out and any power thrown away at a price, so that a solution always
    /// exists; says how much in <see cref="NetworkSolution.ShedMw"/> and <see cref="NetworkSolution.SpillMw"/>.
    /// </summary>
    /// <param name="unservedPrice">Price of both, $/MWh, above 0.</param>
    public NetworkSolution SolveElastic(
        ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw, double unservedPrice, OptimumOptions? options = null)
    {
        if (!(unservedPrice > 0) || !double.IsFinite(unservedPrice))
            throw new ArgumentOutOfRangeException(nameof(unservedPrice), unservedPrice, "The price must be positive and finite.");
        var all = new Block[blocks.Length + (2 * _graph.BusCount)];
        blocks.CopyTo(all);
        for (var i = 0; i < _graph.BusCount; i++)
        {
            all[blocks.Length + (2 * i)] = new Block(i, 0, double.PositiveInfinity, unservedPrice, 0);
            all[blocks.Length + (2 * i) + 1] = new Block(i, double.NegativeInfinity, 0, -unservedPrice, 0);
        }

        var solution = Solve(all, demandMw, options);
        var shed = new double[_graph.BusCount];
        var spill = new double[_graph.BusCount];
        for (var i = 0; i < shed.Length; i++)
        {
            shed[i] = solution.BlockMw[blocks.Length + (2 * i)];
            spill[i] = -solution.BlockMw[blocks.Length + (2 * i) + 1];
        }

        return solution with { BlockMw = solution.BlockMw[..blocks.Length], ShedMw = shed, SpillMw = spill };
    }

    private void Check(ReadOnlySpan<Block> blocks, ReadOnlySpan<double> demandMw)
    {
        if (demandMw.Length != _graph.BusCount)
            throw new ArgumentException($"{demandMw.Length} demands were given for {_graph.BusCount} buses.", nameof(demandMw));
        for (var i = 0; i < demandMw.Length; i++)
        {
            if (!double.IsFinite(demandMw[i]))
                throw new ArgumentException($"The demand at bus number {i} is not finite.", nameof(demandMw));
        }

        for (var k = 0; k < blocks.Length; k++)
        {
            var block = blocks[k];
            if ((uint)block.Bus >= (uint)_graph.BusCount)
                throw new ArgumentException($"Block {k} stands at a bus outside the network.", nameof(blocks));
            if (!(block.LowerMw <= block.UpperMw) || double.IsPositiveInfinity(block.LowerMw) || double.IsNegativeInfinity(block.UpperMw))
                throw new ArgumentException($"Block {k} needs a lower limit that is not above its upper limit.", nameof(blocks));
            if (!double.IsFinite(block.PricePerMwh) || !(block.SlopePerMw2h >= 0) || !double.IsFinite(block.SlopePerMw2h))
                throw new ArgumentException($"Block {k} needs a finite price and a finite slope of at least 0.", nameof(blocks));
            if (double.IsInfinity(block.LowerMw) && double.IsInfinity(block.UpperMw) && block.SlopePerMw2h == 0)
                throw new ArgumentException($"Block {k} needs a limit or a slope.", nameof(blocks));
        }
    }
}
