namespace Halfvoice.Containers;

/// <summary>The bundles of one plan in a folder of their own, which goes when the test ends.</summary>
internal sealed class LabBundles : IDisposable
{
    private readonly DirectoryInfo _folder;

    private LabBundles(DirectoryInfo folder) => _folder = folder;

    /// <summary>The coordinator's bundle.</summary>
    public string Coordinator => Path.Combine(_folder.FullName, "coordinator");

    /// <summary>Each site with its bundle, by name.</summary>
    public IReadOnlyList<(string Site, string Folder)> Sites =>
        [
            .. new DirectoryInfo(Path.Combine(_folder.FullName, "sites")).GetDirectories()
                .OrderBy(d => d.Name, StringComparer.Ordinal)
                .Select(d => (d.Name, d.FullName)),
        ];

    /// <summary>The user ("uid:gid") who may read the bundles.</summary>
    public string Owner { get; private set; } = string.Empty;

    /// <summary>Packs a plan with the rig as it was built with these tests.</summary>
    /// <param name="plan">Folder of the plan.</param>
    /// <param name="coordinator">HOST:PORT at which agents will find the coordinator.</param>
    /// <param name="cancellation">Ends the packing.</param>
    public static async Task<LabBundles> PackAsync(string plan, string coordinator, CancellationToken cancellation)
    {
        var bundles = new LabBundles(Directory.CreateTempSubdirectory("halfvoice-lab-"));
        try
        {
            var rig = Path.Combine(AppContext.BaseDirectory, "halfvoice.dll");
            string[] command = [rig, "pack", plan, bundles._folder.FullName, "--coordinator", coordinator];
            var packed = await ChildCommand.RunAsync("dotnet", command, cancellation);
            Assert.True(packed.ExitCode == 0, $"pack ended with exit code {packed.ExitCode}: {packed.Tail}");
            Assert.True(Directory.Exists(bundles.Coordinator), "pack left no folder coordinator/.");
            bundles.Owner = await ContainerIdentity.HandOverAsync(bundles._folder.FullName, cancellation);
            return bundles;
        }
        catch
        {
            bundles.Dispose();
            throw;
        }
    }

    /// <inheritdoc/>
    public void Dispose() => _folder.Delete(recursive: true);
}
