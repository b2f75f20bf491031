namespace Halfvoice.Plans;

/// <summary>Divides a map among sites: contiguous areas of about equal size.</summary>
internal static class InventedSites
{
    /// <summary>
    /// The site of each point. Each area grows from a seed of its own, always the smallest one next, by a point that
    /// touches it; so areas are connected and every site has at least one point. O(points · log points).
    /// </summary>
    public static int[] Divide(InventedMap map, int sites, SeededNumbers numbers)
    {
        var points = map.X.Length;
        if (sites == points)
            return [.. Enumerable.Range(0, points)];
        var neighbours = new List<int>[points];
        for (var i = 0; i < points; i++)
            neighbours[i] = [];
        foreach (var (from, to) in map.Edges)
        {
            neighbours[from].Add(to);
            neighbours[to].Add(from);
        }

        var owner = new int[points];
        Array.Fill(owner, -1);
        var size = new int[sites];
        var frontier = new Queue<int>[sites];
        var next = new PriorityQueue<int, (int Size, int Site)>();
        var seeds = Seeds(map, sites, numbers);
        for (var site = 0; site < sites; site++)
        {
            owner[seeds[site]] = site;
            size[site] = 1;
            frontier[site] = new Queue<int>(neighbours[seeds[site]]);
            next.Enqueue(site, (1, site));
        }

        while (next.TryDequeue(out var site, out _))
        {
            if (!Grow(site, neighbours, owner, frontier[site]))
                continue;
            size[site]++;
            next.Enqueue(site, (size[site], site));
        }

        return owner;
    }

    private static bool Grow(int site, List<int>[] neighbours, int[] owner, Queue<int> frontier)
    {
        while (frontier.TryDequeue(out var point))
        {
            if (owner[point] >= 0)
                continue;
            owner[point] = site;
            foreach (var neighbour in neighbours[point])
                frontier.Enqueue(neighbour);
            return true;
        }

        return false;
    }

    /// <summary>Points far from each other: every k-th along a boustrophedon through strips of the map.</summary>
    private static int[] Seeds(InventedMap map, int sites, SeededNumbers numbers)
    {
        var points = map.X.Length;
        var strips = Math.Max(1, (int)Math.Round(Math.Sqrt(sites)));
        var height = (map.Y.Max() + 1) / strips;
        var order = Enumerable.Range(0, points)
            .OrderBy(point => (int)(map.Y[point] / height))
            .ThenBy(point => (int)(map.Y[point] / height) % 2 == 0 ? map.X[point] : -map.X[point])
            .ThenBy(point => point)
            .ToArray();
        var offset = numbers.Unit();
        return [.. Enumerable.Range(0, sites).Select(site => order[(int)((site + offset) * points / sites)])];
    }
}
