using Halfvoice.Coordination;
using Halfvoice.Plans;

namespace Halfvoice.Rig.Runs;

/// <summary>record.sqlite: the run as the coordinator saw it, one row an ask and an answer. Nothing private is in it.</summary>
public static class RecordWriter
{
    private const string Schema = """
        CREATE TABLE about (key TEXT PRIMARY KEY, value TEXT NOT NULL);
        CREATE TABLE components (site TEXT NOT NULL, component INTEGER NOT NULL, bus TEXT NOT NULL, penalty REAL NOT NULL, adjustable INTEGER NOT NULL,
          PRIMARY KEY (site, component)) WITHOUT ROWID;
        CREATE TABLE sites (site TEXT PRIMARY KEY, lattice_exponent INTEGER NOT NULL, noise_scale REAL NOT NULL, epsilon_per_answer REAL NOT NULL);
        CREATE TABLE cycles (cycle INTEGER PRIMARY KEY, ended TEXT NOT NULL, rounds INTEGER NOT NULL, seconds REAL NOT NULL, mismatch_mw REAL NOT NULL,
          price_move_per_mwh REAL NOT NULL, mismatch_floor_mw REAL NOT NULL, price_floor_per_mwh REAL NOT NULL, unserved_mw REAL NOT NULL,
          bytes_down INTEGER NOT NULL, bytes_up INTEGER NOT NULL);
        CREATE TABLE rounds (cycle INTEGER NOT NULL, round INTEGER NOT NULL, asked_at_utc TEXT NOT NULL, closed_at_utc TEXT, asked INTEGER NOT NULL,
          answered INTEGER, held INTEGER, mismatch_mw REAL, price_move_per_mwh REAL, mismatch_floor_mw REAL, price_floor_per_mwh REAL,
          window_rounds INTEGER, seconds REAL, PRIMARY KEY (cycle, round)) WITHOUT ROWID;
        CREATE TABLE asks (cycle INTEGER NOT NULL, round INTEGER NOT NULL, site TEXT NOT NULL, component INTEGER NOT NULL,
          consensus REAL NOT NULL, dual REAL NOT NULL, PRIMARY KEY (cycle, round, site, component)) WITHOUT ROWID;
        CREATE TABLE answers (cycle INTEGER NOT NULL, round INTEGER NOT NULL, site TEXT NOT NULL, component INTEGER NOT NULL,
          steps INTEGER NOT NULL, value REAL NOT NULL, PRIMARY KEY (cycle, round, site, component)) WITHOUT ROWID;
        CREATE TABLE events (at_utc TEXT NOT NULL, kind TEXT NOT NULL, site TEXT, cycle INTEGER NOT NULL, round INTEGER NOT NULL, reason TEXT, text TEXT);
        """;

    public static void Write(string path, Plan plan, CoordinatorSetup setup, JournalReader journal)
    {
        using var database = new Database(path, Schema);
        var map = new ComponentMap(setup);
        database.Insert("about", "plan", plan.Name);
        database.Insert("about", "scheme", setup.Scheme.ToString());
        database.Insert("about", "unit_of_values", setup.Scheme == SchemeKind.Injection ? "MW" : "rad");
        database.Insert("about", "setup_digest", setup.SetupDigest);
        var exponent = new Dictionary<string, int>(StringComparer.Ordinal);
        foreach (var site in journal.Sites())
        {
            database.Insert("sites", site.Site, site.LatticeExponent, site.NoiseScale, site.EpsilonPerAnswer);
            exponent[site.Site] = site.LatticeExponent;
        }

        for (var k = 0; k < map.Count; k++)
        {
            var s = map.SiteOf[k];
            database.Insert("components", setup.Sites[s].Name, k - map.Start(s), map.Components[k].Bus, map.Penalty[k], map.Adjustable[k] ? 1 : 0);
        }

        foreach (var c in journal.Cycles())
        {
            database.Insert("cycles", c.Cycle, c.End, c.Rounds, c.Seconds, c.MismatchMw, c.PriceMovePerMwh, c.MismatchFloorMw, c.PriceFloorPerMwh,
                c.UnservedMw, c.BytesDown, c.BytesUp);
        }

        foreach (var round in journal.Rounds())
            WriteRound(database, map, setup, exponent, round);
        foreach (var e in journal.Events())
            database.Insert("events", e.AtUtc, e.Kind, e.Site, e.Cycle, e.Round, e.Reason, e.Text);
    }

    private static void WriteRound(Database database, ComponentMap map, CoordinatorSetup setup, Dictionary<string, int> exponent, JournalRound round)
    {
        var close = round.Close;
        database.Insert("rounds", round.Cycle, round.Round, round.AskedAtUtc, close?.AtUtc, round.AskedSites.Length, close?.Answers.Count,
            close?.Held.Length, close?.MismatchMw, close?.PriceMovePerMwh, close?.MismatchFloorMw, close?.PriceFloorPerMwh,
            close?.WindowRounds, close?.Seconds);
        foreach (var s in round.AskedSites)
        {
            foreach (var k in map.AdjustableOf[s])
                database.Insert("asks", round.Cycle, round.Round, setup.Sites[s].Name, k - map.Start(s), round.Consensus[k], round.Dual[k]);
        }

        if (close is null)
            return;
        foreach (var (s, everything, steps) in close.Answers)
        {
            var name = setup.Sites[s].Name;
            for (var i = 0; i < steps.Length; i++)
            {
                var component = everything ? i : map.AdjustableOf[s][i] - map.Start(s);
                database.Insert("answers", round.Cycle, round.Round, name, component, steps[i], Math.ScaleB(steps[i], exponent[name]));
            }
        }
    }
}
