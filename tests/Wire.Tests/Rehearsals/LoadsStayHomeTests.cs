using System.Globalization;
using System.Text;
using Halfvoice.Tests.Infrastructure;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>No true load may be found anywhere in a run but where loads belong.</summary>
[Collection(RealProcesses.Name)]
public sealed class LoadsStayHomeTests : IDisposable
{
    private readonly TestFolder _folder = new();

    [Fact]
    public async Task No_true_load_is_in_any_file_of_a_run_but_the_truth_the_plan_and_the_sites_own_bundles()
    {
        // The loads get digits that nothing else has, so that finding them anywhere is no coincidence.
        var planFolder = Checkout.CopyPlan(Checkout.Demo, _folder.File("plan"), ("cycles: 3", "cycles: 2"));
        foreach (var file in Directory.GetFiles(Path.Combine(planFolder, "loads")))
            MarkLoads(file);
        var plan = Checkout.Load(planFolder);
        var loads = Enumerable.Range(1, 2).SelectMany(plan.LoadMw).Where(mw => mw != 0).Distinct().ToList();
        Assert.Equal(2 * plan.Network.Buses.Count, loads.Count);

        var (code, _, errors) = await Checkout.RunRigAsync(
            TestContext.Current.CancellationToken, "rehearse", planFolder, "--json", "--runs", _folder.File("runs"));
        Assert.True(code is 0 or 1, errors);
        var run = RunFiles.Only(_folder.File("runs"));

        var found = new List<string>();
        foreach (var path in Directory.EnumerateFiles(run, "*", SearchOption.AllDirectories))
        {
            if (loads.Exists(Holds(File.ReadAllBytes(path))))
                found.Add(Path.GetRelativePath(run, path));
        }

        var expected = plan.Network.Sites
            .SelectMany(site => new[] { Path.Combine("bundles", "sites", site, "loads.csv"), Path.Combine("plan", "loads", site + ".csv") })
            .Append("truth.sqlite");
        Assert.Equal(expected.Order(StringComparer.Ordinal), found.Order(StringComparer.Ordinal));
        Assert.DoesNotContain(loads, Holds(Encoding.UTF8.GetBytes(errors)));

        foreach (var site in plan.Network.Sites)
        {
            var others = plan.Network.Sites.Where(other => other != site).SelectMany(other => plan.Loads[other].At(1)).Where(mw => mw != 0).ToList();
            Assert.DoesNotContain(others, Holds(File.ReadAllBytes(Path.Combine(run, "bundles", "sites", site, "loads.csv"))));
        }
    }

    public void Dispose() => _folder.Dispose();

    private static void MarkLoads(string file)
    {
        var rows = File.ReadAllLines(file);
        var salt = Path.GetFileNameWithoutExtension(file).Sum(c => c);
        for (var i = 1; i < rows.Length; i++)
        {
            var cells = rows[i].Split(',');
            var load = double.Parse(cells[^1], CultureInfo.InvariantCulture);
            cells[^1] = (Math.Round(load, 2) + ((salt * 97 % 9000 + 1009 * i) % 9973 * 1e-7) + 1.3e-7).ToString("0.########", CultureInfo.InvariantCulture);
            rows[i] = string.Join(',', cells);
        }

        File.WriteAllLines(file, rows);
    }

    /// <summary>Whether a file holds a number as text, or as eight bytes of either order (SQLite keeps them big-endian, others do not).</summary>
    private static Predicate<double> Holds(byte[] content) => mw =>
    {
        Span<byte> little = stackalloc byte[8];
        BitConverter.TryWriteBytes(little, mw);
        Span<byte> big = stackalloc byte[8];
        little.CopyTo(big);
        big.Reverse();
        return content.AsSpan().IndexOf(little) >= 0 || content.AsSpan().IndexOf(big) >= 0
            || content.AsSpan().IndexOf(Encoding.UTF8.GetBytes(mw.ToString("R", CultureInfo.InvariantCulture))) >= 0;
    };
}
