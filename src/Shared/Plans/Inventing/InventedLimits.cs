using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Plans;

/// <summary>
/// Line limits that leave a feasible dispatch with room and bind somewhere at the optimum.
/// </summary>
/// <remarks>
/// Two dispatches are at hand for every snapshot: the cheapest one without limits (its flows are f⁰) and a shifted one
/// (flows f¹) in which some plants behind heavily used lines gave way to plants ahead of them. A congested line gets a
/// limit with 1.04·|f¹| ≤ limit ≤ 0.97·|f⁰| in every snapshot, every other line at least 1.15·|f¹| and 1.2·|f⁰|. So
/// the shifted dispatch is feasible with room. And some line binds at every optimum: if none did, the optimum would,
/// by convexity, be the unlimited one, whose flow the congested lines do not allow.
/// </remarks>
internal sealed class InventedLimits
{
    private const double LeastLimitMw = 25;
    private const int MostSwaps = 24;

    private readonly Network _network;
    private readonly PowerFlow _flow;
    private readonly double[][] _loadMw;
    private readonly double[][] _freeFlow;
    private readonly double[] _shifted;

    private InventedLimits(Network network, double[][] loadMw)
    {
        _network = network;
        _flow = new PowerFlow(network);
        _loadMw = loadMw;
        _freeFlow = Array.ConvertAll(loadMw, load => FlowsOf(Cheapest(load), load));
        _shifted = Cheapest(loadMw[0]);
    }

    /// <summary>The limit of each line, MW; null if no line could be made to bind.</summary>
    public static double[]? Choose(Network network, double[][] loadMw, SeededNumbers numbers) =>
        new InventedLimits(network, loadMw).Choose(numbers);

    private double[]? Choose(SeededNumbers numbers)
    {
        var lines = _network.Lines.Count;
        var congested = Congest(Math.Max(1, (int)Math.Round(0.03 * lines)), numbers);
        var shiftedFlow = Array.ConvertAll(_loadMw, load => FlowsOf(Follow(load), load));
        var limits = new double[lines];
        var binding = 0;
        for (var l = 0; l < lines; l++)
        {
            var most = _freeFlow.Max(flow => Math.Abs(flow[l]));
            var shifted = shiftedFlow.Max(flow => Math.Abs(flow[l]));
            var ceiling = 0.97 * _freeFlow.Min(flow => Math.Abs(flow[l]));
            var floor = 1.04 * shifted;
            var spread = numbers.Between(1.2, 2);
            if (congested.Contains(l) && Math.Ceiling(floor) <= ceiling && ceiling >= 8)
            {
                binding++;
                limits[l] = Math.Max(Math.Ceiling(floor), Math.Floor(0.95 * ceiling));
            }
            else
            {
                limits[l] = Math.Max(LeastLimitMw, 5 * Math.Ceiling(Math.Max(spread * most, 1.15 * shifted) / 5));
            }
        }

        return binding > 0 ? limits : null;
    }

    /// <summary>Shifts the dispatch until the flow of up to <paramref name="count"/> heavily used lines has dropped to 85 %.</summary>
    private HashSet<int> Congest(int count, SeededNumbers numbers)
    {
        var byFlow = Enumerable.Range(0, _network.Lines.Count).OrderByDescending(l => Math.Abs(_freeFlow[0][l])).ToArray();
        var heavy = byFlow[..Math.Max(1, (2 * byFlow.Length) / 5)];
        numbers.Shuffle(heavy);
        var congested = new HashSet<int>();
        foreach (var line in heavy.Concat(byFlow.Except(heavy)).Take((2 * count) + 40))
        {
            if (congested.Count == count)
                break;
            if (Relieve(line))
                congested.Add(line);
        }

        return congested;
    }

    private bool Relieve(int line)
    {
        var effect = _flow.Sensitivity(line);
        var direction = Math.Sign(_freeFlow[0][line]);
        var excess = -0.84 * Math.Abs(_freeFlow[0][line]);
        for (var bus = 0; bus < effect.Length; bus++)
            excess -= direction * effect[bus] * _loadMw[0][bus];
        for (var g = 0; g < _shifted.Length; g++)
            excess += direction * effect[_network.Generators[g].Bus] * _shifted[g];
        var before = (double[])_shifted.Clone();
        for (var swap = 0; swap < MostSwaps && excess > 0; swap++)
        {
            if (Swap(effect, direction) is not { } pair)
                break;
            var (up, down, mostMw, gain) = pair;
            var amount = Math.Min(mostMw, excess / gain);
            _shifted[up] += amount;
            _shifted[down] -= amount;
            excess -= gain * amount;
        }

        if (excess <= 1e-6)
            return true;
        before.CopyTo(_shifted, 0);
        return false;
    }

    /// <summary>The two plants whose exchange relieves the line most per MW; each uses at most half of the room that it has left.</summary>
    private (int Up, int Down, double MostMw, double Gain)? Swap(double[] effect, int direction)
    {
        var (up, down) = (-1, -1);
        var (least, most) = (double.PositiveInfinity, double.NegativeInfinity);
        for (var g = 0; g < _shifted.Length; g++)
        {
            var plant = _network.Generators[g];
            var value = direction * effect[plant.Bus];
            if (value < least && RoomUp(g) > 1)
                (up, least) = (g, value);
            if (value > most && RoomDown(g) > 1)
                (down, most) = (g, value);
        }

        return up >= 0 && down >= 0 && most - least > 0.02 ? (up, down, Math.Min(RoomUp(up), RoomDown(down)), most - least) : null;
    }

    private double RoomUp(int plant) => 0.5 * (_network.Generators[plant].MaxMw - _shifted[plant]);

    private double RoomDown(int plant) => 0.5 * (_shifted[plant] - _network.Generators[plant].MinMw);

    /// <summary>The shifted dispatch carried over to another load, each plant moving by its share of the room.</summary>
    private double[] Follow(double[] loadMw)
    {
        var change = loadMw.Sum() - _loadMw[0].Sum();
        var room = _network.Generators.Select((plant, g) => change > 0 ? plant.MaxMw - _shifted[g] : _shifted[g] - plant.MinMw).ToArray();
        var share = change / room.Sum();
        return [.. _shifted.Select((output, g) => output + (share * room[g]))];
    }

    private double[] Cheapest(double[] loadMw) => MeritOrder.Dispatch(_network.Generators, loadMw.Sum())
        ?? throw new InvalidOperationException("Invented plants are always larger than the load.");

    private double[] FlowsOf(double[] output, double[] loadMw)
    {
        var injection = Array.ConvertAll(loadMw, load => -load);
        for (var g = 0; g < output.Length; g++)
            injection[_network.Generators[g].Bus] += output[g];
        return _flow.FlowMw(injection);
    }
}
