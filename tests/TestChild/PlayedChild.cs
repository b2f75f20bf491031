using System.Net.Sockets;
using System.Runtime.InteropServices;
using Halfvoice.Hosting;

namespace Halfvoice.Tests.Child;

/// <summary>
/// A process that lives until it is stopped. Options, any number of them:
/// witness=PATH connects to a Unix socket first, whose other end sees end-of-file when this process is gone;
/// exit=CODE leaves at once with that code; say=TEXT and cry=TEXT write a line to standard output and standard error;
/// lines=N writes N numbered lines; wide=N writes one line of N letters; deaf ignores SIGTERM; hang never stops when asked;
/// environment=NAME writes that variable.
/// </summary>
internal static class PlayedChild
{
    public const int CleanStopExitCode = 7;

    public static int Run(string[] options)
    {
        using var stop = new ManualResetEventSlim();
        using var witness = new Socket(AddressFamily.Unix, SocketType.Stream, ProtocolType.Unspecified);
        var hangs = options.Contains("hang");
        using var term = PosixSignalRegistration.Create(PosixSignal.SIGTERM, context =>
        {
            context.Cancel = true;
            if (!options.Contains("deaf"))
                stop.Set();
        });
        var watched = Lifeline.Watch(
            () =>
            {
                if (!hangs)
                    stop.Set();
            },
            hangs ? TimeSpan.FromMilliseconds(200) : TimeSpan.FromSeconds(60));
        foreach (var option in options)
        {
            var (key, value) = option.Split('=', 2) is [var left, var right] ? (left, right) : (option, "");
            switch (key)
            {
                case "witness":
                    witness.Connect(new UnixDomainSocketEndPoint(value));
                    break;
                case "exit":
                    return int.Parse(value);
                case "say":
                    Console.WriteLine(value);
                    break;
                case "cry":
                    Console.Error.WriteLine(value);
                    break;
                case "lines":
                    for (var line = 0; line < int.Parse(value); line++)
                        Console.WriteLine(line);
                    break;
                case "wide":
                    Console.WriteLine(new string('w', int.Parse(value)));
                    break;
                case "environment":
                    Console.WriteLine(Environment.GetEnvironmentVariable(value));
                    break;
            }
        }

        Console.WriteLine($$"""{"ready":true,"pid":{{Environment.ProcessId}},"lifeline":{{(watched ? "true" : "false")}}}""");
        stop.Wait();
        return CleanStopExitCode;
    }
}
