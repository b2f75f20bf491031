using System.Threading.Channels;
using Google.Protobuf;
using Halfvoice.Coordination;
using Halfvoice.Wire;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Coordinator;

/// <summary>One site's live stream: its outgoing queue and its byte counts.</summary>
internal sealed class SiteStream
{
    // A healthy site has one ask and one outcome outstanding; a site that lets more than this pile up is cut off.
    private const int QueueBound = 64;

    // What gRPC puts before every message: a flag and a length.
    private const int FrameBytes = 5;

    private readonly Channel<V1.FromCoordinator> _outgoing =
        Channel.CreateBounded<V1.FromCoordinator>(new BoundedChannelOptions(QueueBound) { SingleReader = true });

    private long _bytesDown;
    private long _bytesUp;

    public SiteStream(int site, string name)
    {
        Site = site;
        Name = name;
    }

    public int Site { get; }

    public string Name { get; }

    public SiteWire Wire { get; } = new();

    public ChannelReader<V1.FromCoordinator> Outgoing => _outgoing.Reader;

    public long BytesDown => Interlocked.Read(ref _bytesDown);

    public long BytesUp => Interlocked.Read(ref _bytesUp);

    /// <summary>Queues a message; false where the site has stopped reading and must be cut off. Called from the host's loop only.</summary>
    public bool TrySend(CoordinatorMessage message) => TryQueue(Wire.Write(message));

    /// <summary>Queues a sign of life. Called from the host's loop only.</summary>
    public bool TrySendPulse() => TryQueue(Wire.WritePulse());

    public void CountUp(IMessage message) => Interlocked.Add(ref _bytesUp, message.CalculateSize() + FrameBytes);

    /// <summary>Nothing more will be sent; what is queued still leaves.</summary>
    public void Complete() => _outgoing.Writer.TryComplete();

    private bool TryQueue(V1.FromCoordinator message)
    {
        if (!_outgoing.Writer.TryWrite(message))
            return false;
        Interlocked.Add(ref _bytesDown, message.CalculateSize() + FrameBytes);
        return true;
    }
}
