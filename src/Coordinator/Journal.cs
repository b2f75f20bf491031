using System.Globalization;
using System.Runtime.InteropServices;
using Halfvoice.Coordination;
using Microsoft.Data.Sqlite;

namespace Halfvoice.Coordinator;

/// <summary>
/// The coordinator's durable record (SQLite, write-ahead log). Each step is one transaction, written before anything of it
/// is sent, and survives a kill of the process at any instant. Not thread-safe.
/// </summary>
internal sealed class Journal : IDisposable
{
    private readonly SqliteConnection _connection;
    private readonly CoordinatorSetup _setup;
    private readonly TimeProvider _time;
    private readonly SqliteCommand _begin;
    private readonly SqliteCommand _commit;
    private readonly SqliteCommand _asked;
    private readonly SqliteCommand _closed;
    private readonly SqliteCommand _cycle;
    private readonly SqliteCommand _event;
    private readonly SqliteCommand _site;

    private Journal(SqliteConnection connection, CoordinatorSetup setup, TimeProvider time)
    {
        _connection = connection;
        _setup = setup;
        _time = time;
        // Prepared once: a transaction object of the library would parse and prepare both every round.
        _begin = Prepare("BEGIN", 0);
        _commit = Prepare("COMMIT", 0);
        _asked = Prepare("INSERT INTO asked VALUES ($1,$2,$3,$4,$5,$6,$7)", 7);
        _closed = Prepare("INSERT INTO closed VALUES ($1,$2,$3,$4,$5,$6,$7,$8,$9,$10,$11,$12,$13)", 13);
        _cycle = Prepare("INSERT INTO cycles VALUES ($1,$2,$3,$4,$5,$6,$7,$8,$9,$10,$11,$12,$13,$14)", 14);
        _event = Prepare("INSERT INTO events (at_utc,kind,site,cycle,round,reason,text) VALUES ($1,$2,$3,$4,$5,$6,$7)", 7);
        _site = Prepare("INSERT OR REPLACE INTO sites VALUES ($1,$2,$3,$4)", 4);
    }

    /// <summary>Opens or creates the journal.</summary>
    /// <exception cref="InvalidDataException">The file belongs to another plan or version, is damaged, or another coordinator has it open.</exception>
    public static Journal Open(string path, CoordinatorSetup setup, TimeProvider time)
    {
        var connection = new SqliteConnection(new SqliteConnectionStringBuilder { DataSource = path, Pooling = false, DefaultTimeout = 1 }.ToString());
        try
        {
            connection.Open();
            Execute(connection, "PRAGMA journal_mode=WAL; PRAGMA synchronous=NORMAL; PRAGMA locking_mode=EXCLUSIVE; PRAGMA wal_autocheckpoint=4000;");
            Execute(connection, JournalSchema.Create);
            CheckMeta(connection, "schema", JournalSchema.Version.ToString(CultureInfo.InvariantCulture), "another version of the coordinator");
            CheckMeta(connection, "setup_digest", setup.SetupDigest, "another plan");
            return new Journal(connection, setup, time);
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

    /// <summary>Where the journal ends, or null where it is new.</summary>
    /// <exception cref="InvalidDataException">The file is damaged.</exception>
    public (RoundId Last, bool CycleClosed, CoordinatorState State)? ReadEnd()
    {
        try
        {
            return ReadLast();
        }
        catch (SqliteException unusable) when (WhyUnusable(unusable) is not null)
        {
            throw new InvalidDataException(WhyUnusable(unusable), unusable);
        }
    }

    private (RoundId Last, bool CycleClosed, CoordinatorState State)? ReadLast()
    {
        var asked = ReadState("SELECT cycle, round, consensus, dual FROM asked ORDER BY cycle DESC, round DESC LIMIT 1");
        var closed = ReadState("SELECT cycle, rounds, consensus, dual FROM cycles ORDER BY cycle DESC LIMIT 1");
        if (asked is null && closed is null)
            return null;
        if (closed is { } done && (asked is null || done.Last.Cycle >= asked.Value.Last.Cycle))
            return (done.Last, true, done.State);
        return (asked!.Value.Last, false, asked.Value.State);
    }

    /// <summary>Stores all entries of a step in one transaction.</summary>
    /// <param name="bytes">Wire bytes (down, up) since the last cycle ended; asked for when a cycle ends.</param>
    public void Store(IReadOnlyList<JournalEntry> entries, Func<(long Down, long Up)> bytes)
    {
        if (entries.Count == 0)
            return;
        _begin.ExecuteNonQuery();
        var at = _time.GetUtcNow().ToString("O", CultureInfo.InvariantCulture);
        foreach (var entry in entries)
            Store(entry, at, bytes);
        _commit.ExecuteNonQuery();
    }

    public void Dispose()
    {
        foreach (var command in new[] { _begin, _commit, _asked, _closed, _cycle, _event, _site })
            command.Dispose();
        _connection.Dispose();
    }

    /// <summary>
    /// What a user can do something about, in words; null for the rest. The numbers are SQLite's primary result codes: 1 error (here:
    /// tables that are none of ours), 5 busy, 6 locked, 11 corrupt, 14 cannot open, 26 not a database.
    /// </summary>
    private static string? WhyUnusable(SqliteException failure) => failure.SqliteErrorCode switch
    {
        5 or 6 => "Another coordinator has this journal open. A plan has one coordinator.",
        1 => "The file in the journal's place is not a journal of this version of the coordinator. Give it an empty state folder.",
        11 or 26 => "The journal is damaged. Restore it from its last sound copy; "
            + "with an empty state folder sites refuse the rounds that they answered before.",
        14 => "The journal cannot be opened: something else is in its place, or the state folder may not be written.",
        _ => null,
    };

    private static void Execute(SqliteConnection connection, string sql)
    {
        using var command = connection.CreateCommand();
        command.CommandText = sql;
        command.ExecuteNonQuery();
    }

    private static void CheckMeta(SqliteConnection connection, string key, string value, string whose)
    {
        using var command = connection.CreateCommand();
        command.CommandText = "INSERT OR IGNORE INTO meta VALUES ($key, $value); SELECT value FROM meta WHERE key = $key";
        command.Parameters.AddWithValue("$key", key);
        command.Parameters.AddWithValue("$value", value);
        if (command.ExecuteScalar() as string != value)
            throw new InvalidDataException(
                $"The journal was written for {whose}. Give the coordinator an empty state folder, or the bundle that it was started with.");
    }

    private void Store(JournalEntry entry, string at, Func<(long Down, long Up)> bytes)
    {
        switch (entry)
        {
            case JournalEntry.RoundAsked asked:
                Run(_asked, asked.Id.Cycle, asked.Id.Round, at,
                    Bytes(asked.Asks.Select(pair => pair.Site).ToArray()),
                    asked.Asks.Select(pair => (byte)(pair.Ask.Everything ? 1 : 0)).ToArray(),
                    Bytes(asked.State.Consensus), Bytes(asked.State.Dual));
                break;
            case JournalEntry.RoundClosed closed:
                var m = closed.Measure;
                Run(_closed, closed.Id.Cycle, closed.Id.Round, at, closed.Answers.Count, closed.Answers.Count + closed.Held.Count,
                    Pack(closed.Answers), Bytes(closed.Held.ToArray()), m.MismatchMw, m.PriceMovePerMwh, m.MismatchFloorMw,
                    m.PriceFloorPerMwh, m.Window, closed.Seconds);
                break;
            case JournalEntry.CycleClosed cycle:
                var (down, up) = bytes();
                Run(_cycle, cycle.Cycle, at, cycle.End.ToString(), cycle.Rounds, cycle.Seconds, cycle.Measure.MismatchMw,
                    cycle.Measure.PriceMovePerMwh, cycle.Measure.MismatchFloorMw, cycle.Measure.PriceFloorPerMwh, cycle.UnservedMw,
                    down, up, Bytes(cycle.State.Consensus), Bytes(cycle.State.Dual));
                break;
            case JournalEntry.SiteJoined joined:
                Run(_site, NameOf(joined.Site), joined.Enrol.LatticeExponent, joined.Enrol.NoiseScale, joined.Enrol.EpsilonPerAnswer);
                Event("joined", joined.Site, RoundId.None, null, null, at);
                break;
            case JournalEntry.SiteLeft left:
                Event("left", left.Site, RoundId.None, null, null, at);
                break;
            case JournalEntry.Refused refused:
                Event(refused.BySite ? "refused by site" : "refused", refused.Site, refused.Refusal.Id, refused.Refusal.Reason.ToString(),
                    refused.Refusal.Text, at);
                break;
            default:
                throw new ArgumentOutOfRangeException(nameof(entry));
        }
    }

    private void Event(string kind, int site, RoundId id, string? reason, string? text, string at) =>
        Run(_event, at, kind, NameOf(site), id.Cycle, id.Round, reason, text);

    private string NameOf(int site) => _setup.Sites[site].Name;

    private SqliteCommand Prepare(string sql, int parameters)
    {
        var command = _connection.CreateCommand();
        command.CommandText = sql;
        for (var i = 1; i <= parameters; i++)
            command.Parameters.Add(new SqliteParameter { ParameterName = "$" + i.ToString(CultureInfo.InvariantCulture) });
        command.Prepare();
        return command;
    }

    private static void Run(SqliteCommand command, params ReadOnlySpan<object?> values)
    {
        for (var i = 0; i < values.Length; i++)
            command.Parameters[i].Value = values[i] ?? DBNull.Value;
        command.ExecuteNonQuery();
    }

    private (RoundId Last, CoordinatorState State)? ReadState(string sql)
    {
        using var command = _connection.CreateCommand();
        command.CommandText = sql;
        using var reader = command.ExecuteReader();
        if (!reader.Read())
            return null;
        var consensus = MemoryMarshal.Cast<byte, double>((byte[])reader.GetValue(2)).ToArray();
        var dual = MemoryMarshal.Cast<byte, double>((byte[])reader.GetValue(3)).ToArray();
        return (new RoundId(reader.GetInt32(0), reader.GetInt32(1)), new CoordinatorState(consensus, dual));
    }

    private static byte[] Bytes<T>(T[] values)
        where T : unmanaged => MemoryMarshal.AsBytes(values.AsSpan()).ToArray();

    private static byte[] Pack(IReadOnlyList<(int Site, Answer Answer)> answers)
    {
        var size = answers.Sum(pair => 12 + (8 * pair.Answer.Steps.Length));
        var packed = new byte[size];
        var at = 0;
        foreach (var (site, answer) in answers)
        {
            ReadOnlySpan<int> head = [site, answer.Everything ? 1 : 0, answer.Steps.Length];
            MemoryMarshal.AsBytes(head).CopyTo(packed.AsSpan(at));
            MemoryMarshal.AsBytes(answer.Steps.AsSpan()).CopyTo(packed.AsSpan(at + 12));
            at += 12 + (8 * answer.Steps.Length);
        }

        return packed;
    }
}
