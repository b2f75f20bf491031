using System.Globalization;
using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Privacy;
using Microsoft.Data.Sqlite;

namespace Halfvoice.Agent;

/// <summary>
/// The site's durable ledger (SQLite, write-ahead log, synced to disk at every commit): what was charged, and the
/// set-points that cycles left. One agent at a time. Not thread-safe.
/// </summary>
internal sealed class SiteLedger : IDisposable
{
    public const int SchemaVersion = 1;

    private const string Create = """
        CREATE TABLE IF NOT EXISTS meta (key TEXT PRIMARY KEY, value TEXT NOT NULL);
        CREATE TABLE IF NOT EXISTS charges (
          id INTEGER PRIMARY KEY, at_utc TEXT NOT NULL, scope TEXT NOT NULL, period INTEGER NOT NULL, cycle INTEGER NOT NULL,
          first_round INTEGER NOT NULL, answers INTEGER NOT NULL, epsilon_units_each INTEGER NOT NULL, state TEXT NOT NULL, used INTEGER NOT NULL);
        CREATE TABLE IF NOT EXISTS set_points (
          cycle INTEGER NOT NULL, generator TEXT NOT NULL, mw REAL NOT NULL, accepted INTEGER NOT NULL, at_utc TEXT NOT NULL,
          PRIMARY KEY (cycle, generator)) WITHOUT ROWID;
        """;

    private const string Damaged = "The ledger is damaged. The site answers nothing until it is restored from its last sound copy.";

    private readonly SqliteConnection _connection;
    private readonly TimeProvider _time;

    private SiteLedger(SqliteConnection connection, TimeProvider time)
    {
        _connection = connection;
        _time = time;
    }

    /// <summary>Opens or creates the ledger and locks it for this process.</summary>
    /// <exception cref="InvalidDataException">It belongs to another site or version, or another agent has it open.</exception>
    public static SiteLedger Open(string path, SiteSetup setup, TimeProvider time)
    {
        var connection = new SqliteConnection(new SqliteConnectionStringBuilder { DataSource = path, Pooling = false, DefaultTimeout = 1 }.ToString());
        try
        {
            connection.Open();
            var ledger = new SiteLedger(connection, time);
            ledger.Execute("PRAGMA locking_mode=EXCLUSIVE; PRAGMA journal_mode=WAL; PRAGMA synchronous=FULL; PRAGMA cache_size=-128;");
            ledger.Execute("BEGIN EXCLUSIVE; " + Create + " COMMIT;");
            ledger.CheckMeta("schema", SchemaVersion.ToString(CultureInfo.InvariantCulture), "another version of the agent");
            ledger.CheckMeta("site", setup.Site, "another site");
            return ledger;
        }
        catch (SqliteException unusable) when (WhyUnusable(unusable) is not null)
        {
            connection.Dispose();
            throw new InvalidDataException(WhyUnusable(unusable), unusable);
        }
        catch
        {
            connection.Dispose();
            throw;
        }
    }

    /// <exception cref="InvalidDataException">A row or the file is damaged.</exception>
    public IReadOnlyList<ChargeRow> ReadCharges()
    {
        try
        {
            return ReadRows();
        }
        catch (SqliteException unusable) when (WhyUnusable(unusable) is not null)
        {
            throw new InvalidDataException(WhyUnusable(unusable), unusable);
        }
        catch (Exception damaged) when (damaged is InvalidCastException or OverflowException or FormatException)
        {
            // SQLite keeps whatever was put into a column, whatever the column's type.
            throw new InvalidDataException(Damaged, damaged);
        }
    }

    private List<ChargeRow> ReadRows()
    {
        var rows = new List<ChargeRow>();
        using var command = _connection.CreateCommand();
        command.CommandText = "SELECT id, scope, period, cycle, first_round, answers, epsilon_units_each, state, used FROM charges ORDER BY id";
        using var reader = command.ExecuteReader();
        while (reader.Read())
        {
            if (!Enum.TryParse<PrivacyScope>(reader.GetString(1), out var scope) || !Enum.TryParse<ChargeState>(reader.GetString(7), out var state))
                throw new InvalidDataException($"Row {reader.GetInt64(0)} of the ledger is damaged. Restore the ledger from its last sound copy.");
            rows.Add(new ChargeRow(reader.GetInt64(0), scope, reader.GetInt64(2), reader.GetInt32(3), reader.GetInt32(4), reader.GetInt32(5),
                reader.GetInt64(6), state, reader.GetInt32(8)));
        }

        return rows;
    }

    /// <summary>Stores rows in one synced transaction; they are on disk when this returns.</summary>
    public void Store(IReadOnlyList<ChargeRow> charges, IReadOnlyList<SetPoint> setPoints)
    {
        if (charges.Count == 0 && setPoints.Count == 0)
            return;
        var at = _time.GetUtcNow().ToString("O", CultureInfo.InvariantCulture);
        using var transaction = _connection.BeginTransaction();
        foreach (var row in charges)
        {
            Run(transaction, "INSERT OR REPLACE INTO charges VALUES ($1,$2,$3,$4,$5,$6,$7,$8,$9,$10)", row.Id, at, row.Scope.ToString(), row.Period,
                row.Cycle, row.FirstRound, row.Answers, row.EpsilonUnitsEach, row.State.ToString(), row.Used);
        }

        foreach (var point in setPoints)
        {
            Run(transaction, "INSERT OR REPLACE INTO set_points VALUES ($1,$2,$3,$4,$5)", point.Cycle, point.Generator, point.Mw,
                point.Accepted ? 1 : 0, at);
        }

        transaction.Commit();
    }

    public void Dispose() => _connection.Dispose();

    /// <summary>
    /// What a user can do something about, in words; null for the rest. The numbers are SQLite's primary result codes: 1 error (here:
    /// tables that are none of ours), 5 busy, 6 locked, 11 corrupt, 14 cannot open, 26 not a database.
    /// </summary>
    private static string? WhyUnusable(SqliteException failure) => failure.SqliteErrorCode switch
    {
        5 or 6 => "Another agent has this ledger open. One site runs one agent.",
        1 => "The file in the ledger's place is not a ledger of this version of the agent. Give the agent its own state folder.",
        11 or 26 => Damaged,
        14 => "The ledger cannot be opened: something else is in its place, or the state folder may not be written.",
        _ => null,
    };

    private void Execute(string sql)
    {
        using var command = _connection.CreateCommand();
        command.CommandText = sql;
        command.ExecuteNonQuery();
    }

    private void CheckMeta(string key, string value, string whose)
    {
        using var command = _connection.CreateCommand();
        command.CommandText = "INSERT OR IGNORE INTO meta VALUES ($key, $value); SELECT value FROM meta WHERE key = $key";
        command.Parameters.AddWithValue("$key", key);
        command.Parameters.AddWithValue("$value", value);
        if (command.ExecuteScalar() as string != value)
            throw new InvalidDataException($"The ledger was written for {whose}. Give the agent its own state folder.");
    }

    private void Run(SqliteTransaction transaction, string sql, params ReadOnlySpan<object> values)
    {
        using var command = _connection.CreateCommand();
        command.CommandText = sql;
        command.Transaction = transaction;
        for (var i = 0; i < values.Length; i++)
            command.Parameters.AddWithValue("$" + (i + 1).ToString(CultureInfo.InvariantCulture), values[i]);
        command.ExecuteNonQuery();
    }
}
