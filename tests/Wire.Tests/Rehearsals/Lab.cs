using System.Globalization;
using System.Net;
using System.Text.Json;
using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Rig.Authority;
using Halfvoice.Rig.Binaries;
using Halfvoice.Rig.Runs;
using Halfvoice.Tests.Infrastructure;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>Bundles of a plan with an authority of the test's own, and processes that are started, killed and started again by the test.</summary>
internal sealed class Lab : IAsyncDisposable
{
    private readonly TestFolder _folder = new();
    private readonly List<LineProcess> _processes = [];
    private readonly AgentBinaries _binaries;
    private int _port;

    private Lab(Plan plan, AgentBinaries binaries)
    {
        Plan = plan;
        _binaries = binaries;
        Setups = new SetupBuilder(plan);
        Authority = LabAuthority.Create(TimeSpan.FromDays(30), TimeProvider.System);
        new BundleWriter(plan, Setups, Authority).WriteAll(Bundles, ["localhost"], [IPAddress.Loopback]);
    }

    public Plan Plan { get; }

    public SetupBuilder Setups { get; }

    public LabAuthority Authority { get; }

    public string Bundles => _folder.File("bundles");

    public string CoordinatorState => _folder.File("coordinator");

    /// <summary>Where the coordinator listens, once it was started; it gets the same port again.</summary>
    public int Port => _port;

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    public static async Task<Lab> CreateAsync(Plan plan) => new(plan, await Checkout.BinariesAsync());

    public string SiteBundle(string site) => BundleWriter.SiteFolder(Bundles, site);

    public string SiteState(string site) => Path.Combine(_folder.Path, "states", site);

    public string LedgerOf(string site) => Path.Combine(SiteState(site), "ledger.sqlite");

    public string NewFolder(string name) => Directory.CreateDirectory(_folder.File(name)).FullName;

    /// <summary>Starts the coordinator and waits until it listens.</summary>
    public async Task<LineProcess> StartCoordinatorAsync()
    {
        var coordinator = Start("coordinator", _binaries.CoordinatorPath,
            "--bundle", BundleWriter.CoordinatorFolder(Bundles), "--state", CoordinatorState,
            "--listen", string.Create(CultureInfo.InvariantCulture, $"127.0.0.1:{_port}"));
        var ready = await coordinator.WaitForAsync(line => line.StartsWith("{\"event\":\"ready\"", StringComparison.Ordinal), Cancel);
        using var json = JsonDocument.Parse(ready);
        _port = json.RootElement.GetProperty("port").GetInt32();
        return coordinator;
    }

    /// <summary>Starts an agent, with another bundle or state folder than the site's own where that is said.</summary>
    public LineProcess StartAgent(string site, string? bundle = null, string? state = null) => Start($"agent {site}", _binaries.AgentPath,
        "--bundle", bundle ?? SiteBundle(site), "--state", state ?? SiteState(site),
        "--coordinator", string.Create(CultureInfo.InvariantCulture, $"127.0.0.1:{Math.Max(1, _port)}"));

    /// <summary>Starts every site's agent, except some.</summary>
    public Dictionary<string, LineProcess> StartAgents(params string[] except) =>
        Plan.Network.Sites.Except(except).ToDictionary(site => site, site => StartAgent(site));

    /// <summary>The journal, for after the coordinator's end.</summary>
    public JournalReader OpenJournal() => new(Path.Combine(CoordinatorState, "journal.sqlite"));

    public string CoordinatorLog() => File.ReadAllText(Path.Combine(CoordinatorState, "coordinator.jsonl"));

    public string AgentLog(string site) => File.ReadAllText(Path.Combine(SiteState(site), "agent.jsonl"));

    /// <summary>Waits until a site's agents have joined so many times in all, by what they log.</summary>
    public async Task JoinedAsync(string site, int times)
    {
        Directory.CreateDirectory(SiteState(site));
        var joined = new TaskCompletionSource(TaskCreationOptions.RunContinuationsAsynchronously);
        using var watch = new FileSystemWatcher(SiteState(site), "agent.jsonl");
        watch.Changed += (_, _) => Look();
        watch.Created += (_, _) => Look();
        watch.EnableRaisingEvents = true;
        Look();
        await joined.Task.WaitAsync(LineProcess.Patience, Cancel);

        void Look()
        {
            var path = Path.Combine(SiteState(site), "agent.jsonl");
            if (!File.Exists(path))
                return;
            using var reader = new StreamReader(new FileStream(path, FileMode.Open, FileAccess.Read, FileShare.ReadWrite));
            if (reader.ReadToEnd().Split("Joined; next is cycle").Length > times)
                joined.TrySetResult();
        }
    }

    public async ValueTask DisposeAsync()
    {
        foreach (var process in _processes)
            await process.DisposeAsync();
        Authority.Dispose();
        _folder.Dispose();
    }

    private LineProcess Start(string name, string executable, params string[] arguments)
    {
        var process = LineProcess.Start(name, executable, arguments, _binaries.Environment);
        _processes.Add(process);
        return process;
    }
}
