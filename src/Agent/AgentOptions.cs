using System.CommandLine;
using System.CommandLine.Parsing;
using System.Globalization;
using System.Net;

namespace Halfvoice.Agent;

/// <summary>The command line of an agent.</summary>
internal sealed class AgentOptions
{
    /// <summary>Folder with site.json, loads.csv, identity.pem, identity.key, authority.pem and revoked.crl; read only.</summary>
    public required string Bundle { get; init; }

    /// <summary>Folder for the ledger and the log; kept across restarts.</summary>
    public required string State { get; init; }

    /// <summary>Where the coordinator listens; null takes what the bundle says.</summary>
    public DnsEndPoint? Coordinator { get; init; }

    /// <summary>Reads the command line and hands the options on; prints what is wrong and returns 2 otherwise.</summary>
    public static Task<int> RunAsync(string[] args, Func<AgentOptions, Task<int>> run)
    {
        var bundle = new Option<DirectoryInfo>("--bundle") { Description = "Folder that 'halfvoice pack' made for this site (read only).", Required = true };
        var state = new Option<DirectoryInfo>("--state") { Description = "Folder for ledger and log; keep it across restarts.", Required = true };
        var coordinator = new Option<DnsEndPoint?>("--coordinator")
        {
            Description = "HOST:PORT of the coordinator, where it is another than the bundle says.",
            CustomParser = ParseOption,
        };
        var root = new RootCommand("Halfvoice agent: answers for one site. Shadow mode: set-points are computed and logged, and written nowhere else.")
        {
            bundle, state, coordinator,
        };
        root.SetAction((parse, _) => run(new AgentOptions
        {
            Bundle = parse.GetRequiredValue(bundle).FullName,
            State = parse.GetRequiredValue(state).FullName,
            Coordinator = parse.GetValue(coordinator),
        }));
        var parsed = root.Parse(args);
        if (parsed.Errors.Count == 0)
            return parsed.InvokeAsync();
        foreach (var error in parsed.Errors)
            Console.Error.WriteLine(error.Message);
        return Task.FromResult(ExitCodes.WrongSetup);
    }

    /// <summary>Reads HOST:PORT; null where it is none.</summary>
    public static DnsEndPoint? ReadEndPoint(string text)
    {
        var colon = text.LastIndexOf(':');
        return colon > 0 && ushort.TryParse(text[(colon + 1)..], NumberStyles.None, CultureInfo.InvariantCulture, out var port) && port > 0
            ? new DnsEndPoint(text[..colon].Trim('[', ']'), port)
            : null;
    }

    private static DnsEndPoint? ParseOption(ArgumentResult result)
    {
        var text = result.Tokens.Count == 1 ? result.Tokens[0].Value : string.Empty;
        var address = ReadEndPoint(text);
        if (address is null)
            result.AddError($"--coordinator wants HOST:PORT, such as coordinator.lab:7443; it is '{text}'.");
        return address;
    }
}
