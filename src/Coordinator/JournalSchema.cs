namespace Halfvoice.Coordinator;

/// <summary>
/// Tables of the journal. Rounds are kept whole in one row each, so that closing a round costs one insert whatever the
/// number of sites; the rig spreads them out into the record afterwards.
/// </summary>
internal static class JournalSchema
{
    public const int Version = 1;

    public const string Create = """
        CREATE TABLE IF NOT EXISTS meta (key TEXT PRIMARY KEY, value TEXT NOT NULL);
        CREATE TABLE IF NOT EXISTS asked (
          cycle INTEGER NOT NULL, round INTEGER NOT NULL, at_utc TEXT NOT NULL,
          sites BLOB NOT NULL,      -- int32 site index, one for each ask that left
          everything BLOB NOT NULL, -- one byte for each: 1 where all components were asked for
          consensus BLOB NOT NULL, dual BLOB NOT NULL, -- float64 by component, all sites
          PRIMARY KEY (cycle, round)) WITHOUT ROWID;
        CREATE TABLE IF NOT EXISTS closed (
          cycle INTEGER NOT NULL, round INTEGER NOT NULL, at_utc TEXT NOT NULL,
          answered INTEGER NOT NULL, asked INTEGER NOT NULL,
          answers BLOB NOT NULL,    -- for each answer: int32 site, int32 everything, int32 count, int64 steps
          held BLOB NOT NULL,       -- int32 site index
          mismatch_mw REAL NOT NULL, price_move_per_mwh REAL NOT NULL,
          mismatch_floor_mw REAL NOT NULL, price_floor_per_mwh REAL NOT NULL, window_rounds INTEGER NOT NULL,
          seconds REAL NOT NULL,
          PRIMARY KEY (cycle, round)) WITHOUT ROWID;
        CREATE TABLE IF NOT EXISTS cycles (
          cycle INTEGER PRIMARY KEY, at_utc TEXT NOT NULL, ended TEXT NOT NULL, rounds INTEGER NOT NULL, seconds REAL NOT NULL,
          mismatch_mw REAL NOT NULL, price_move_per_mwh REAL NOT NULL, mismatch_floor_mw REAL NOT NULL, price_floor_per_mwh REAL NOT NULL,
          unserved_mw REAL NOT NULL, bytes_down INTEGER NOT NULL, bytes_up INTEGER NOT NULL,
          consensus BLOB NOT NULL, dual BLOB NOT NULL);
        CREATE TABLE IF NOT EXISTS sites (
          site TEXT PRIMARY KEY, lattice_exponent INTEGER NOT NULL, noise_scale REAL NOT NULL, epsilon_per_answer REAL NOT NULL);
        CREATE TABLE IF NOT EXISTS events (
          id INTEGER PRIMARY KEY, at_utc TEXT NOT NULL, kind TEXT NOT NULL, site TEXT, cycle INTEGER, round INTEGER, reason TEXT, text TEXT);
        """;
}
