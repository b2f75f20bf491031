using Halfvoice.Grid;
using Halfvoice.Plans;
using Halfvoice.Rig.Binaries;
using Halfvoice.Rig.Runs;
using Halfvoice.Rig.Terminal;

namespace Halfvoice.Benchmarks;

/// <summary>What the product's own exchange measured.</summary>
/// <param name="Sites">Agent processes.</param>
/// <param name="Rounds">Rounds of all cycles but the first, which warms up.</param>
/// <param name="RoundsPerSecond">Rounds over the cycles' time.</param>
/// <param name="ReadySeconds">From the first agent's start until all had joined.</param>
/// <param name="ResidentMb">Largest resident memory of an agent that was seen, MB; NaN where the system does not say.</param>
public sealed record RealExchangeResult(int Sites, int Rounds, double RoundsPerSecond, double ReadySeconds, double ResidentMb);

/// <summary>
/// The product's exchange: a real rehearsal in which every site has one bus with a plant, noise so small that it hardly
/// moves the dispatch, and stop limits out of reach, so that every round asks every site until the cap. Ledger, journal,
/// identities and noise are those of any rehearsal.
/// </summary>
public static class RealExchange
{
    /// <param name="sites">3 to 5,000.</param>
    /// <param name="rounds">Round cap.</param>
    /// <param name="jit">Uses the JIT build also where a native one could be made.</param>
    public static async Task<RealExchangeResult> MeasureAsync(int sites, int rounds, bool jit)
    {
        var plan = EverySiteAdjustable(InventedPlans.Make(sites, 7), rounds);
        var binaries = await AgentBinaries.LocateAsync(new BinaryOptions { JitOnly = jit }, Console.Error.WriteLine).ConfigureAwait(false);
        var runs = Directory.CreateTempSubdirectory("halfvoice-exchange-").FullName;
        try
        {
            var folder = RunFolder.Create(runs, plan.Name, TimeProvider.System.GetUtcNow());
            var view = new ProgressView(TextWriter.Null, false, plan.Cycles, sites, 60, TimeProvider.System);
            var rehearsal = new Halfvoice.Rig.Runs.Rehearsal(plan, binaries, folder, view);
            using var done = new CancellationTokenSource();
            var memory = WatchMemoryAsync(Path.GetFileName(binaries.AgentPath), done.Token);
            var verdict = await rehearsal.RunAsync(new Dictionary<string, string>(), CancellationToken.None).ConfigureAwait(false);
            await done.CancelAsync().ConfigureAwait(false);
            // The first cycle warms up, as the bare exchange does before it counts.
            var counted = verdict.Cycles.Skip(1).ToArray();
            var total = counted.Sum(cycle => cycle.Rounds);
            return new RealExchangeResult(
                sites, total, total / counted.Sum(cycle => cycle.Seconds), rehearsal.ReadyAfter?.TotalSeconds ?? double.NaN,
                await memory.ConfigureAwait(false));
        }
        finally
        {
            Directory.Delete(runs, recursive: true);
        }
    }

    private static Plan EverySiteAdjustable(Plan plan, int rounds)
    {
        var network = plan.Network;
        var bare = Enumerable.Range(0, network.Buses.Count).Where(bus => !network.GeneratorsAt(bus).Any(g => network.Generators[g].RangeMw > 1));
        var plants = bare.Select(bus => new Generator($"spare-{bus}", bus, 0, 5, 0.1, 60)).ToArray();
        return plan with
        {
            Cycles = 4,
            Network = new Network(network.BaseMva, network.Buses, network.Lines, [.. network.Generators, .. plants]),
            Stop = plan.Stop with { RoundCap = rounds, MismatchFraction = 1e-15, PriceMovePerMwh = 1e-15 },
            Privacy = new PrivacySettings { AdjacencyMw = 0.001, Epsilon = 1000, Scope = PrivacyScope.Round, Stated = true },
        };
    }

    private static async Task<double> WatchMemoryAsync(string agentName, CancellationToken done)
    {
        var largest = double.NaN;
        try
        {
            while (true)
            {
                await Task.Delay(TimeSpan.FromSeconds(1), done).ConfigureAwait(false);
                foreach (var process in System.Diagnostics.Process.GetProcessesByName(agentName))
                {
                    using (process)
                        largest = Math.Max(double.IsNaN(largest) ? 0 : largest, process.WorkingSet64 / 1048576.0);
                }
            }
        }
        catch (Exception ended) when (ended is OperationCanceledException or InvalidOperationException)
        {
            return largest;
        }
    }
}
