using System.CommandLine;
using System.CommandLine.Parsing;
using System.Globalization;
using System.Net;

namespace Halfvoice.Coordinator;

/// <summary>The command line of the coordinator.</summary>
internal sealed class CoordinatorOptions
{
    /// <summary>Folder with coordinator.json, identity.pem, identity.key, authority.pem and revoked.crl; read only.</summary>
    public required string Bundle { get; init; }

    /// <summary>Folder for the journal and the log; kept across restarts.</summary>
    public required string State { get; init; }

    /// <summary>Address and port to listen on; port 0 takes a free one.</summary>
    public required IPEndPoint Listen { get; init; }

    /// <summary>Reads the command line and hands the options on; prints what is wrong and returns 2 otherwise.</summary>
    public static Task<int> RunAsync(string[] args, Func<CoordinatorOptions, Task<int>> run)
    {
        var bundle = new Option<DirectoryInfo>("--bundle")
        {
            Description = "Folder that 'halfvoice pack' made for the coordinator (read only).",
            Required = true,
        };
        var state = new Option<DirectoryInfo>("--state") { Description = "Folder for journal and log; keep it across restarts.", Required = true };
        var listen = new Option<IPEndPoint>("--listen")
        {
            Description = "ADDRESS:PORT to listen on; port 0 takes a free one and says which.",
            CustomParser = ParseEndPoint,
            DefaultValueFactory = _ => new IPEndPoint(IPAddress.Loopback, 0),
        };
        var root = new RootCommand("Halfvoice coordinator: asks the sites of a plan, round by round, until the dispatch settles. "
            + "Shadow mode: nothing here writes a set-point to equipment.")
        {
            bundle, state, listen,
        };
        root.SetAction((parse, _) => run(new CoordinatorOptions
        {
            Bundle = parse.GetRequiredValue(bundle).FullName,
            State = parse.GetRequiredValue(state).FullName,
            Listen = parse.GetRequiredValue(listen),
        }));
        var parsed = root.Parse(args);
        return parsed.Errors.Count > 0 ? Complain(parsed.Errors) : parsed.InvokeAsync();
    }

    private static Task<int> Complain(IEnumerable<ParseError> errors)
    {
        foreach (var error in errors)
            Console.Error.WriteLine(error.Message);
        return Task.FromResult(ExitCodes.WrongSetup);
    }

    private static IPEndPoint? ParseEndPoint(ArgumentResult result)
    {
        var text = result.Tokens.Count == 1 ? result.Tokens[0].Value : string.Empty;
        var colon = text.LastIndexOf(':');
        if (colon > 0 && IPAddress.TryParse(text[..colon].Trim('[', ']'), out var address)
            && ushort.TryParse(text[(colon + 1)..], NumberStyles.None, CultureInfo.InvariantCulture, out var port))
        {
            return new IPEndPoint(address, port);
        }

        result.AddError($"--listen wants ADDRESS:PORT, such as 0.0.0.0:7443; it is '{text}'.");
        return null;
    }
}
