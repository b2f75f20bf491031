using Halfvoice.Coordination;
using Halfvoice.Optimization;
using Halfvoice.Plans;

namespace Halfvoice.Rig.Runs;

/// <summary>
/// truth.sqlite: true loads, the central optimum and the delivered dispatch of every cycle. Private: it exists because a
/// rehearsal has all loads, and it never leaves the machine that rehearses.
/// </summary>
public sealed class TruthWriter : IDisposable
{
    private const string Schema = """
        CREATE TABLE about (key TEXT PRIMARY KEY, value TEXT NOT NULL);
        CREATE TABLE buses (cycle INTEGER NOT NULL, bus TEXT NOT NULL, site TEXT NOT NULL, load_mw REAL NOT NULL, optimum_price_per_mwh REAL NOT NULL,
          PRIMARY KEY (cycle, bus)) WITHOUT ROWID;
        CREATE TABLE generators (cycle INTEGER NOT NULL, generator TEXT NOT NULL, optimum_mw REAL NOT NULL, set_point_mw REAL, delivered_mw REAL,
          PRIMARY KEY (cycle, generator)) WITHOUT ROWID;
        CREATE TABLE lines (cycle INTEGER NOT NULL, line TEXT NOT NULL, limit_mw REAL, optimum_mw REAL NOT NULL, delivered_mw REAL,
          PRIMARY KEY (cycle, line)) WITHOUT ROWID;
        CREATE TABLE cycles (cycle INTEGER PRIMARY KEY, optimum_per_hour REAL NOT NULL, delivered_per_hour REAL, cost_gap REAL, reserve_mw REAL,
          unbalanced_mw REAL, worst_loading REAL);
        """;

    private readonly Database _database;
    private readonly Plan _plan;

    public TruthWriter(string path, Plan plan)
    {
        _plan = plan;
        _database = new Database(path, Schema);
        _database.Insert("about", "label", "PRIVATE: true loads of all sites; for the rehearsal only");
        _database.Insert("about", "plan", plan.Name);
    }

    public void Add(int cycle, double[] loadMw, Optimum optimum, double[]? setPointsMw, DeliveredScore? score)
    {
        var network = _plan.Network;
        for (var b = 0; b < network.Buses.Count; b++)
            _database.Insert("buses", cycle, network.Buses[b].Name, network.Buses[b].Site, loadMw[b], optimum.PricePerMwh[b]);
        for (var g = 0; g < network.Generators.Count; g++)
            _database.Insert("generators", cycle, network.Generators[g].Name, optimum.DispatchMw[g], setPointsMw?[g], score?.OutputMw[g]);
        for (var l = 0; l < network.Lines.Count; l++)
        {
            var limit = network.Lines[l].LimitMw;
            _database.Insert("lines", cycle, network.Lines[l].Name, double.IsFinite(limit) ? limit : null, optimum.FlowMw[l], score?.FlowMw[l]);
        }

        _database.Insert("cycles", cycle, optimum.CostPerHour, score?.CostPerHour, score?.CostGap, score?.ReserveMw, score?.UnbalancedMw, score?.WorstLoading);
    }

    public void Dispose() => _database.Dispose();
}
