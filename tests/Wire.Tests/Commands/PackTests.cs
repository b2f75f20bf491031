using System.Globalization;
using System.Net;
using System.Net.Sockets;
using Halfvoice.Rig.Runs;
using Halfvoice.Tests.Infrastructure;
using Halfvoice.Tests.Rehearsals;

namespace Halfvoice.Tests.Commands;

/// <summary>Bundles are complete and private, and run without the rig.</summary>
[Collection(RealProcesses.Name)]
public sealed class PackTests : IDisposable
{
    private readonly TestFolder _folder = new();

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Theory]
    [InlineData("HOST:PORT", "--coordinator", "nowhere")]
    [InlineData("HOST:PORT", "--coordinator", ":7443")]
    [InlineData("HOST:PORT", "--coordinator", "lab:0")]
    [InlineData("HOST:PORT", "--coordinator", "lab:70000")]
    [InlineData("1 to 3650", "--coordinator", "lab:7443", "--days", "0")]
    [InlineData("1 to 3650", "--coordinator", "lab:7443", "--days", "3651")]
    [InlineData("HOST", "--coordinator", "two words:7443")]
    public async Task Bad_arguments_are_told_and_nothing_is_written(string words, params string[] options)
    {
        (await RigConsole.RunAsync(["pack", Checkout.Sample, _folder.File("bundles"), .. options])).AssertRefused(words);
        Assert.False(Directory.Exists(_folder.File("bundles")));
    }

    [Fact]
    public async Task Bundles_are_never_mixed_with_other_files_and_never_made_of_a_wrong_plan()
    {
        await File.WriteAllTextAsync(_folder.File("mine.txt"), "precious", Cancel);
        (await RigConsole.RunAsync("pack", Checkout.Sample, _folder.Path, "--coordinator", "lab:7443")).AssertRefused("is not empty");
        (await RigConsole.RunAsync("pack", _folder.Path, _folder.File("bundles"), "--coordinator", "lab:7443")).AssertRefused("plan.yaml");
        Assert.Equal(["mine.txt"], Directory.EnumerateFileSystemEntries(_folder.Path).Select(Path.GetFileName));
    }

    [Fact]
    public async Task Packed_bundles_run_by_the_processes_alone_to_a_settled_dispatch()
    {
        var port = FreePort();
        var address = string.Create(CultureInfo.InvariantCulture, $"127.0.0.1:{port}");
        var packed = await RigConsole.RunAsync("pack", Checkout.Sample, _folder.File("bundles"), "--coordinator", address, "--days", "2");
        Assert.True(packed.ExitCode == 0, packed.Errors);
        var sites = Checkout.Load(Checkout.Sample).Network.Sites;
        AssertWholeAndPrivate(sites);

        var binaries = await Checkout.BinariesAsync();
        await using var coordinator = LineProcess.Start("coordinator", binaries.CoordinatorPath,
            ["--bundle", BundleWriter.CoordinatorFolder(_folder.File("bundles")), "--state", _folder.File("coordinator"), "--listen", address],
                binaries.Environment);
        var agents = sites.Select(site => LineProcess.Start(site, binaries.AgentPath,
            ["--bundle", BundleWriter.SiteFolder(_folder.File("bundles"), site), "--state", _folder.File("state-" + site), "--coordinator", address],
                binaries.Environment)).ToList();

        Assert.Equal(0, await coordinator.EndAsync(Cancel));
        foreach (var agent in agents)
        {
            Assert.Equal(0, await agent.EndAsync(Cancel));
            await agent.DisposeAsync();
        }

        using var journal = new JournalReader(Path.Combine(_folder.File("coordinator"), "journal.sqlite"));
        Assert.Equal(["Settled", "Settled"], journal.Cycles().Select(cycle => cycle.End));
    }

    public void Dispose() => _folder.Dispose();

    private static int FreePort()
    {
        using var listener = new TcpListener(IPAddress.Loopback, 0);
        listener.Start();
        return ((IPEndPoint)listener.LocalEndpoint).Port;
    }

    private void AssertWholeAndPrivate(IEnumerable<string> sites)
    {
        foreach (var site in sites)
        {
            Assert.Equal(
                ["authority.pem", "identity.key", "identity.pem", "loads.csv", "revoked.crl", "site.json"],
                Directory.EnumerateFiles(BundleWriter.SiteFolder(_folder.File("bundles"), site)).Select(Path.GetFileName).Order(StringComparer.Ordinal));
        }

        Assert.Equal(
            ["authority.pem", "coordinator.json", "identity.key", "identity.pem", "revoked.crl"],
            Directory.EnumerateFiles(BundleWriter.CoordinatorFolder(_folder.File("bundles"))).Select(Path.GetFileName).Order(StringComparer.Ordinal));
        if (OperatingSystem.IsWindows())
            return;
        foreach (var path in Directory.EnumerateFiles(_folder.File("bundles"), "*", SearchOption.AllDirectories))
            Assert.Equal(UnixFileMode.UserRead | UnixFileMode.UserWrite, File.GetUnixFileMode(path));
    }
}
