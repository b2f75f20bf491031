using Microsoft.Data.Sqlite;

namespace Halfvoice.Rig.Runs;

/// <summary>A new SQLite file that is written once, in one transaction.</summary>
internal sealed class Database : IDisposable
{
    private readonly SqliteConnection _connection;
    private readonly SqliteTransaction _transaction;
    private readonly Dictionary<string, SqliteCommand> _inserts = [];

    public Database(string path, string schema)
    {
        File.Delete(path);
        _connection = new SqliteConnection(new SqliteConnectionStringBuilder { DataSource = path, Pooling = false }.ToString());
        _connection.Open();
        if (!OperatingSystem.IsWindows())
            File.SetUnixFileMode(path, UnixFileMode.UserRead | UnixFileMode.UserWrite);
        using (var command = _connection.CreateCommand())
        {
            command.CommandText = schema;
            command.ExecuteNonQuery();
        }

        _transaction = _connection.BeginTransaction();
    }

    public void Insert(string table, params ReadOnlySpan<object?> values)
    {
        if (!_inserts.TryGetValue(table, out var command))
        {
            command = _connection.CreateCommand();
            command.Transaction = _transaction;
            for (var i = 0; i < values.Length; i++)
                command.Parameters.Add(new SqliteParameter { ParameterName = $"$p{i}" });
            command.CommandText = $"INSERT INTO {table} VALUES ({string.Join(',', command.Parameters.Cast<SqliteParameter>().Select(p => p.ParameterName))})";
            _inserts.Add(table, command);
        }

        for (var i = 0; i < values.Length; i++)
            command.Parameters[i].Value = values[i] ?? DBNull.Value;
        command.ExecuteNonQuery();
    }

    public void Dispose()
    {
        _transaction.Commit();
        foreach (var command in _inserts.Values)
            command.Dispose();
        _transaction.Dispose();
        _connection.Dispose();
    }
}
