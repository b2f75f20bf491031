using System.Net.Sockets;

namespace Halfvoice.Tests.Infrastructure;

/// <summary>
/// Sees processes live and die that are not our children: each connects to a Unix socket, and the kernel closes that connection
/// when the process is gone, whatever ended it.
/// </summary>
public sealed class Witness : IDisposable
{
    private readonly TestFolder _folder = new();
    private readonly Socket _listener = new(AddressFamily.Unix, SocketType.Stream, ProtocolType.Unspecified);
    private readonly List<Socket> _connections = [];

    public Witness()
    {
        Path = _folder.File("witness");
        _listener.Bind(new UnixDomainSocketEndPoint(Path));
        _listener.Listen(1000);
    }

    public string Path { get; }

    /// <summary>Waits until <paramref name="count"/> processes have connected.</summary>
    public async Task MeetAsync(int count, CancellationToken cancel)
    {
        while (_connections.Count < count)
            _connections.Add(await _listener.AcceptAsync(cancel));
    }

    /// <summary>True when any of the processes is gone; none ever writes, so that readable means ended.</summary>
    public bool SomeoneIsGone => _connections.Any(connection => connection.Poll(0, SelectMode.SelectRead));

    /// <summary>Waits until every process that was met is gone.</summary>
    public async Task AllGoneAsync(CancellationToken cancel)
    {
        foreach (var connection in _connections)
        {
            try
            {
                Assert.Equal(0, await connection.ReceiveAsync(new byte[1], cancel));
            }
            catch (SocketException reset) when (reset.SocketErrorCode == SocketError.ConnectionReset)
            {
                // Also an end.
            }
        }
    }

    public void Dispose()
    {
        foreach (var connection in _connections)
            connection.Dispose();
        _listener.Dispose();
        _folder.Dispose();
    }
}
