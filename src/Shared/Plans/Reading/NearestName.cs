namespace Halfvoice.Plans;

/// <summary>Finds the known name that a mistyped one most likely meant.</summary>
internal static class NearestName
{
    private const int LongestCompared = 80;

    /// <summary>The nearest of the known names if it is near enough to be a likely slip, else null.</summary>
    public static string? Of(string name, IEnumerable<string> known)
    {
        if (name.Length > LongestCompared)
            return null;
        string? best = null;
        var bestDistance = int.MaxValue;
        foreach (var candidate in known)
        {
            if (Math.Abs(candidate.Length - name.Length) >= bestDistance || candidate.Length > LongestCompared)
                continue;
            var distance = Distance(name.ToLowerInvariant(), candidate.ToLowerInvariant());
            if (distance < bestDistance)
                (best, bestDistance) = (candidate, distance);
        }

        return bestDistance <= 1 + (name.Length / 3) ? best : null;
    }

    /// <summary>": did you mean 'x'?" or an empty text.</summary>
    public static string Hint(string name, IEnumerable<string> known) => Of(name, known) is { } near ? $": did you mean '{near}'?" : "";

    /// <summary>Letters to insert, delete, replace or swap with a neighbour (Damerau, 1964; optimal string alignment).</summary>
    public static int Distance(string a, string b)
    {
        var twoBack = new int[b.Length + 1];
        var back = new int[b.Length + 1];
        var row = new int[b.Length + 1];
        for (var j = 0; j <= b.Length; j++)
            back[j] = j;
        for (var i = 1; i <= a.Length; i++)
        {
            row[0] = i;
            for (var j = 1; j <= b.Length; j++)
            {
                var replace = back[j - 1] + (a[i - 1] == b[j - 1] ? 0 : 1);
                row[j] = Math.Min(replace, Math.Min(back[j], row[j - 1]) + 1);
                if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
                    row[j] = Math.Min(row[j], twoBack[j - 2] + 1);
            }

            (twoBack, back, row) = (back, row, twoBack);
        }

        return back[b.Length];
    }
}
