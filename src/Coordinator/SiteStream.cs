using Google.Protobuf;
using Grpc.Core;
using Halfvoice.Coordination;
using Halfvoice.Wire;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Coordinator;

/// <summary>
/// One site's live stream: what is sent to it, in order, and its byte counts. The host puts messages in order under its lock
/// and flushes after it has let go, so that writing holds up nobody who brings an answer, and a round needs no extra hop
/// between threads.
/// </summary>
internal sealed class SiteStream
{
    // A healthy site has one ask and one outcome outstanding; a site that lets more than this pile up is cut off.
    private const int QueueBound = 64;

    // What gRPC puts before every message: a flag and a length.
    private const int FrameBytes = 5;

    private readonly IServerStreamWriter<V1.FromCoordinator> _writer;
    private readonly Action _abort;
    private readonly Lock _gate = new();
    private readonly Queue<V1.FromCoordinator> _waiting = new();
    private readonly TaskCompletionSource _sent = new(TaskCreationOptions.RunContinuationsAsynchronously);
    private bool _writing;
    private bool _complete;
    private long _bytesDown;
    private long _bytesUp;

    /// <param name="site">Index of the site.</param>
    /// <param name="name">Its name.</param>
    /// <param name="writer">Where messages go.</param>
    /// <param name="abort">Cuts the connection off.</param>
    public SiteStream(int site, string name, IServerStreamWriter<V1.FromCoordinator> writer, Action abort)
    {
        Site = site;
        Name = name;
        _writer = writer;
        _abort = abort;
    }

    public int Site { get; }

    public string Name { get; }

    public SiteWire Wire { get; } = new();

    /// <summary>Completes when <see cref="Complete"/> was called and everything before it has left, or when the stream broke.</summary>
    public Task AllSent => _sent.Task;

    public long BytesDown => Interlocked.Read(ref _bytesDown);

    public long BytesUp => Interlocked.Read(ref _bytesUp);

    /// <summary>Puts a message in its place; false where the site has stopped reading and must be cut off. Called under the host's lock only.</summary>
    public bool TrySend(CoordinatorMessage message) => TrySend(Wire.Write(message));

    /// <summary>Puts a sign of life in its place. Called under the host's lock only.</summary>
    public bool TrySendPulse() => TrySend(Wire.WritePulse());

    public void CountUp(IMessage message) => Interlocked.Add(ref _bytesUp, message.CalculateSize() + FrameBytes);

    /// <summary>Cuts off a site that answers pings but no longer reads what it is sent.</summary>
    public void CutOff()
    {
        GiveUp();
        _abort();
    }

    /// <summary>Nothing more will be sent; what waits still leaves.</summary>
    public void Complete()
    {
        lock (_gate)
        {
            _complete = true;
            if (!_writing && _waiting.Count == 0)
                _sent.TrySetResult();
        }
    }

    /// <summary>Starts writing what waits, unless that is under way already.</summary>
    public void Flush()
    {
        V1.FromCoordinator? first;
        lock (_gate)
        {
            if (_writing || !_waiting.TryDequeue(out first))
                return;
            _writing = true;
        }

        Write(first);
    }

    private bool TrySend(V1.FromCoordinator message)
    {
        lock (_gate)
        {
            if (_complete)
                return true;
            if (_waiting.Count >= QueueBound)
                return false;
            Interlocked.Add(ref _bytesDown, message.CalculateSize() + FrameBytes);
            _waiting.Enqueue(message);
            return true;
        }
    }

    /// <summary>Writes a message and whatever waits behind it; goes on in the background where the connection makes us wait.</summary>
    private void Write(V1.FromCoordinator first)
    {
        try
        {
            var message = first;
            do
            {
                var write = _writer.WriteAsync(message);
                if (!write.IsCompletedSuccessfully)
                {
                    _ = FinishAsync(write);
                    return;
                }
            }
            while (Next(out message));
        }
        catch (Exception broken) when (IsBroken(broken))
        {
            GiveUp();
        }
    }

    private async Task FinishAsync(Task write)
    {
        try
        {
            await write.ConfigureAwait(false);
            while (Next(out var next))
                await _writer.WriteAsync(next).ConfigureAwait(false);
        }
        catch (Exception broken) when (IsBroken(broken))
        {
            GiveUp();
        }
    }

    private static bool IsBroken(Exception failure) =>
        failure is InvalidOperationException or IOException or OperationCanceledException or RpcException;

    /// <summary>The connection is gone; the reading side finds that out and tells the host. Nothing of what waits can leave.</summary>
    private void GiveUp()
    {
        lock (_gate)
        {
            _complete = true;
            _waiting.Clear();
        }

        _sent.TrySetResult();
    }

    /// <summary>Takes the next waiting message, or ends the writing.</summary>
    private bool Next([System.Diagnostics.CodeAnalysis.NotNullWhen(true)] out V1.FromCoordinator? next)
    {
        lock (_gate)
        {
            if (_waiting.TryDequeue(out next))
                return true;
            _writing = false;
            if (_complete)
                _sent.TrySetResult();
            return false;
        }
    }
}
