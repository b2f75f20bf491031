using System.Runtime.InteropServices;
using Halfvoice.Benchmarks.BareExchange;
using Halfvoice.Hosting;

// bare-exchange server CLIENTS ROUNDS WARM_UP COMPONENTS FOLDER   or   bare-exchange client PORT FOLDER NAME
using var stop = new CancellationTokenSource();
using var term = PosixSignalRegistration.Create(PosixSignal.SIGTERM, context =>
{
    context.Cancel = true;
    stop.Cancel();
});
Lifeline.Watch(stop.Cancel);
try
{
    switch (args)
    {
        case ["server", var clients, var rounds, var warmUp, var components, var folder]:
            await BareServer.RunAsync(int.Parse(clients), int.Parse(rounds), int.Parse(warmUp), int.Parse(components), folder, stop.Token);
            return 0;
        case ["client", var port, var folder, var name]:
            await BareClient.RunAsync(int.Parse(port), folder, name, stop.Token);
            return 0;
        default:
            Console.Error.WriteLine("server CLIENTS ROUNDS WARM_UP COMPONENTS FOLDER   or   client PORT FOLDER NAME");
            return 64;
    }
}
catch (OperationCanceledException) when (stop.IsCancellationRequested)
{
    return 0;
}
