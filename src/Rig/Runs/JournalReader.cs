using System.Runtime.InteropServices;
using Microsoft.Data.Sqlite;

namespace Halfvoice.Rig.Runs;

/// <summary>A cycle as the coordinator's journal has it.</summary>
public sealed record JournalCycle(
    int Cycle, string End, int Rounds, double Seconds, double MismatchMw, double PriceMovePerMwh, double MismatchFloorMw,
    double PriceFloorPerMwh, double UnservedMw, long BytesDown, long BytesUp);

/// <summary>A round as the coordinator's journal has it; nothing about answers where it was never closed.</summary>
public sealed record JournalRound(
    int Cycle, int Round, string AskedAtUtc, int[] AskedSites, double[] Consensus, double[] Dual, bool[] Everything, JournalClose? Close);

/// <summary>How a round closed.</summary>
public sealed record JournalClose(
    string AtUtc, IReadOnlyList<(int Site, bool Everything, long[] Steps)> Answers, int[] Held, double MismatchMw,
    double PriceMovePerMwh, double MismatchFloorMw, double PriceFloorPerMwh, int WindowRounds, double Seconds);

/// <summary>How a site's answers are to be read.</summary>
public sealed record JournalSite(string Site, int LatticeExponent, double NoiseScale, double EpsilonPerAnswer);

/// <summary>An event of the journal.</summary>
public sealed record JournalEvent(string AtUtc, string Kind, string? Site, int Cycle, int Round, string? Reason, string? Text);

/// <summary>Reads a coordinator's journal after the coordinator has ended.</summary>
public sealed class JournalReader : IDisposable
{
    private readonly SqliteConnection _connection;

    public JournalReader(string path)
    {
        var file = new SqliteConnectionStringBuilder { DataSource = path, Pooling = false, Mode = SqliteOpenMode.ReadWrite };
        _connection = new SqliteConnection(file.ToString());
        _connection.Open();
    }

    public IReadOnlyList<JournalCycle> Cycles() => Read(
        """
        SELECT cycle, ended, rounds, seconds, mismatch_mw, price_move_per_mwh, mismatch_floor_mw, price_floor_per_mwh, unserved_mw, bytes_down, bytes_up
        FROM cycles ORDER BY cycle
        """,
        r => new JournalCycle(r.GetInt32(0), r.GetString(1), r.GetInt32(2), r.GetDouble(3), r.GetDouble(4), r.GetDouble(5), r.GetDouble(6),
            r.GetDouble(7), r.GetDouble(8), r.GetInt64(9), r.GetInt64(10)));

    public IReadOnlyList<JournalSite> Sites() => Read(
        "SELECT site, lattice_exponent, noise_scale, epsilon_per_answer FROM sites ORDER BY site",
        r => new JournalSite(r.GetString(0), r.GetInt32(1), r.GetDouble(2), r.GetDouble(3)));

    public IReadOnlyList<JournalEvent> Events() => Read(
        "SELECT at_utc, kind, site, cycle, round, reason, text FROM events ORDER BY id",
        r => new JournalEvent(r.GetString(0), r.GetString(1), Text(r, 2), r.GetInt32(3), r.GetInt32(4), Text(r, 5), Text(r, 6)));

    public IReadOnlyList<JournalRound> Rounds() => Read(
        """
        SELECT a.cycle, a.round, a.at_utc, a.sites, a.everything, a.consensus, a.dual,
               c.at_utc, c.answers, c.held, c.mismatch_mw, c.price_move_per_mwh, c.mismatch_floor_mw, c.price_floor_per_mwh, c.window_rounds, c.seconds
        FROM asked a LEFT JOIN closed c ON c.cycle = a.cycle AND c.round = a.round ORDER BY a.cycle, a.round
        """,
        r => new JournalRound(r.GetInt32(0), r.GetInt32(1), r.GetString(2), Numbers<int>(r, 3), Numbers<double>(r, 5), Numbers<double>(r, 6),
            Array.ConvertAll((byte[])r.GetValue(4), b => b != 0), r.IsDBNull(7) ? null : Close(r)));

    public void Dispose() => _connection.Dispose();

    private static JournalClose Close(SqliteDataReader r) => new(
        r.GetString(7), Answers((byte[])r.GetValue(8)), Numbers<int>(r, 9), r.GetDouble(10), r.GetDouble(11), r.GetDouble(12), r.GetDouble(13),
        r.GetInt32(14), r.GetDouble(15));

    private static List<(int Site, bool Everything, long[] Steps)> Answers(byte[] packed)
    {
        var answers = new List<(int, bool, long[])>();
        var rest = packed.AsSpan();
        while (rest.Length > 0)
        {
            var head = MemoryMarshal.Cast<byte, int>(rest[..12]);
            var bytes = 8 * head[2];
            answers.Add((head[0], head[1] != 0, MemoryMarshal.Cast<byte, long>(rest.Slice(12, bytes)).ToArray()));
            rest = rest[(12 + bytes)..];
        }

        return answers;
    }

    private static T[] Numbers<T>(SqliteDataReader reader, int column)
        where T : unmanaged => MemoryMarshal.Cast<byte, T>((byte[])reader.GetValue(column)).ToArray();

    private static string? Text(SqliteDataReader reader, int column) => reader.IsDBNull(column) ? null : reader.GetString(column);

    private List<T> Read<T>(string sql, Func<SqliteDataReader, T> row)
    {
        var rows = new List<T>();
        using var command = _connection.CreateCommand();
        command.CommandText = sql;
        using var reader = command.ExecuteReader();
        while (reader.Read())
            rows.Add(row(reader));
        return rows;
    }
}
