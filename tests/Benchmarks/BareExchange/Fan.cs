using Grpc.Core;
using Halfvoice.Benchmarks.BareExchange.Wire;

namespace Halfvoice.Benchmarks.BareExchange;

/// <summary>Sends one ask to every client and collects one answer from each: a round.</summary>
/// <remarks>
/// Only the round loop writes, so each stream has one writer; every ask is a message and a flush of its own, as it would be in
/// the product, where no two sites get the same ask.
/// </remarks>
internal sealed class Fan(int clients, int components)
{
    private readonly List<IServerStreamWriter<BareAsk>> _writers = [];
    private readonly Task[] _writes = new Task[clients];
    private readonly TaskCompletionSource _complete = new(TaskCreationOptions.RunContinuationsAsynchronously);
    private TaskCompletionSource _answered = new(TaskCreationOptions.RunContinuationsAsynchronously);
    private int _outstanding;
    private ulong _round;
    private ulong _sequence;

    /// <summary>Completes when all clients have joined.</summary>
    public Task Complete => _complete.Task;

    /// <summary>Takes a client in and reads its answers until it leaves.</summary>
    public async Task JoinAsync(IAsyncStreamReader<BareAnswer> reader, IServerStreamWriter<BareAsk> writer, CancellationToken cancel)
    {
        lock (_writers)
        {
            _writers.Add(writer);
            if (_writers.Count == clients)
                _complete.SetResult();
        }

        while (await reader.MoveNext(cancel))
            Take(reader.Current);
    }

    /// <summary>Plays one round.</summary>
    public async Task RoundAsync(CancellationToken cancel)
    {
        _round++;
        _answered = new TaskCompletionSource(TaskCreationOptions.RunContinuationsAsynchronously);
        Volatile.Write(ref _outstanding, clients);
        for (var client = 0; client < clients; client++)
            _writes[client] = _writers[client].WriteAsync(Ask(client), cancel);
        await Task.WhenAll(_writes);
        await _answered.Task.WaitAsync(cancel);
    }

    private void Take(BareAnswer answer)
    {
        if (answer.Round != Volatile.Read(ref _round) || answer.Steps.Count != components)
        {
            throw new InvalidOperationException(
                $"An answer to round {answer.Round} with {answer.Steps.Count} components came in round {_round}.");
        }

        if (Interlocked.Decrement(ref _outstanding) == 0)
            _answered.SetResult();
    }

    private BareAsk Ask(int client)
    {
        var ask = new BareAsk { Version = 1, Cycle = 1, Round = _round, Sequence = ++_sequence };
        for (var i = 0; i < components; i++)
        {
            ask.Target.Add(100.5 + client + i);
            ask.Price.Add(30.25 + (0.001 * _round));
        }

        return ask;
    }
}
