namespace Halfvoice.Plans;

/// <summary>Finds the known name that a mistyped one most likely meant.</summary>
internal static class NearestName
{
    private const int LongestCompared = 80;

    // A hint is a courtesy: a plan with many names and many errors must not wait for it.
    private const int MostCompared = 5000;

    /// <summary>The nearest of the known names if it is near enough to be a likely slip, else null.</summary>
    public static string? Of(string name, IEnumerable<string> known)
    {
        if (name.Length > LongestCompared)
            return null;
        var sought = name.ToLowerInvariant();
        string? best = null;
        var tooFar = 2 + (name.Length / 3);
        foreach (var candidate in known.Take(MostCompared))
        {
            if (Math.Abs(candidate.Length - name.Length) >= tooFar || candidate.Length > LongestCompared)
                continue;
            var distance = Distance(sought, candidate.ToLowerInvariant(), tooFar);
            if (distance < tooFar)
                (best, tooFar) = (candidate, distance);
        }

        return best;
    }

    /// <summary>": did you mean 'x'?" or an empty text.</summary>
    public static string Hint(string name, IEnumerable<string> known) => Of(name, known) is { } near ? $": did you mean '{near}'?" : "";

    /// <summary>
    /// Letters to insert, delete, replace or swap with a neighbour (Damerau, 1964; optimal string alignment), or
    /// <paramref name="tooFar"/> as soon as it is certain to be reached.
    /// </summary>
    public static int Distance(string a, string b, int tooFar = int.MaxValue)
    {
        var twoBack = new int[b.Length + 1];
        var back = new int[b.Length + 1];
        var row = new int[b.Length + 1];
        for (var j = 0; j <= b.Length; j++)
            back[j] = j;
        for (var i = 1; i <= a.Length; i++)
        {
            row[0] = i;
            var least = i;
            for (var j = 1; j <= b.Length; j++)
            {
                var replace = back[j - 1] + (a[i - 1] == b[j - 1] ? 0 : 1);
                row[j] = Math.Min(replace, Math.Min(back[j], row[j - 1]) + 1);
                if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
                    row[j] = Math.Min(row[j], twoBack[j - 2] + 1);
                least = Math.Min(least, row[j]);
            }

            // A swap reaches back one row more; that row's least is at most one less, and the swap itself costs one.
            if (least > tooFar)
                return tooFar;

            (twoBack, back, row) = (back, row, twoBack);
        }

        return Math.Min(back[b.Length], tooFar);
    }
}
