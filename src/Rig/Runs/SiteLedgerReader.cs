using Halfvoice.Privacy;
using Microsoft.Data.Sqlite;

namespace Halfvoice.Rig.Runs;

/// <summary>What a rehearsal reads from a site's own ledger after its agent has ended. In the field nobody does.</summary>
public static class SiteLedgerReader
{
    /// <summary>Set-points by cycle and generator, MW, and privacy charged by cycle.</summary>
    public static (IReadOnlyList<(int Cycle, string Generator, double Mw, bool Accepted)> SetPoints, IReadOnlyDictionary<int, double> EpsilonByCycle)
        Read(string path)
    {
        var points = new List<(int, string, double, bool)>();
        var epsilon = new Dictionary<int, double>();
        using var connection = new SqliteConnection(new SqliteConnectionStringBuilder { DataSource = path, Pooling = false }.ToString());
        connection.Open();
        using (var command = connection.CreateCommand())
        {
            command.CommandText = "SELECT cycle, generator, mw, accepted FROM set_points ORDER BY cycle, generator";
            using var reader = command.ExecuteReader();
            while (reader.Read())
                points.Add((reader.GetInt32(0), reader.GetString(1), reader.GetDouble(2), reader.GetInt32(3) != 0));
        }

        using (var command = connection.CreateCommand())
        {
            command.CommandText = """
                SELECT cycle, SUM(epsilon_units_each * (CASE state WHEN 'Settled' THEN used WHEN 'Refused' THEN 0 ELSE answers END))
                FROM charges GROUP BY cycle
                """;
            using var reader = command.ExecuteReader();
            while (reader.Read())
                epsilon[reader.GetInt32(0)] = reader.GetInt64(1) / (double)EpsilonUnits.PerOne;
        }

        return (points, epsilon);
    }
}
