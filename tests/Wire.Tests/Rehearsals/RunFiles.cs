using System.Globalization;
using Microsoft.Data.Sqlite;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>Looks into what a run left behind.</summary>
internal static class RunFiles
{
    /// <summary>The one run folder under a folder of runs.</summary>
    public static string Only(string runs) => Assert.Single(Directory.GetDirectories(runs));

    public static IReadOnlyList<object[]> Query(string database, string sql)
    {
        using var connection = new SqliteConnection(
            new SqliteConnectionStringBuilder { DataSource = database, Pooling = false, Mode = SqliteOpenMode.ReadWrite }.ToString());
        connection.Open();
        using var command = connection.CreateCommand();
        command.CommandText = sql;
        using var reader = command.ExecuteReader();
        var rows = new List<object[]>();
        while (reader.Read())
        {
            var row = new object[reader.FieldCount];
            reader.GetValues(row);
            rows.Add(row);
        }

        return rows;
    }

    public static long Count(string database, string sql) => Convert.ToInt64(Query(database, sql)[0][0], CultureInfo.InvariantCulture);

    /// <summary>All columns of all tables, as table.column.</summary>
    public static IReadOnlyList<string> Columns(string database) => Query(
            database, "SELECT m.name || '.' || c.name FROM sqlite_master m JOIN pragma_table_info(m.name) c WHERE m.type = 'table'")
        .Select(row => (string)row[0]).ToList();
}
