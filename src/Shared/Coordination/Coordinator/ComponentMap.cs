namespace Halfvoice.Coordination;

/// <summary>All numbers that sites answer with, in one flat order: site by site, each in its own component order.</summary>
public sealed class ComponentMap
{
    private readonly int[] _start;

    public ComponentMap(CoordinatorSetup setup)
    {
        _start = new int[setup.Sites.Count + 1];
        for (var s = 0; s < setup.Sites.Count; s++)
            _start[s + 1] = _start[s] + setup.Sites[s].Components.Count;
        Components = setup.Sites.SelectMany(site => site.Components).ToArray();
        SiteOf = new int[Components.Count];
        Adjustable = new bool[Components.Count];
        Penalty = new double[Components.Count];
        MwPerUnit = new double[Components.Count];
        AdjustableOf = new int[setup.Sites.Count][];
        for (var s = 0; s < setup.Sites.Count; s++)
        {
            for (var k = _start[s]; k < _start[s + 1]; k++)
            {
                SiteOf[k] = s;
                Penalty[k] = Components[k].Penalty;
                Adjustable[k] = Penalty[k] > 0;
                MwPerUnit[k] = Components[k].MwPerUnit;
            }

            AdjustableOf[s] = Enumerable.Range(_start[s], _start[s + 1] - _start[s]).Where(k => Adjustable[k]).ToArray();
        }
    }

    public IReadOnlyList<CoordinatorComponent> Components { get; }

    public int Count => Components.Count;

    public int SiteCount => _start.Length - 1;

    public int[] SiteOf { get; }

    /// <summary>Whether a component can move within a cycle (penalty above 0).</summary>
    public bool[] Adjustable { get; }

    public double[] Penalty { get; }

    public double[] MwPerUnit { get; }

    /// <summary>Flat indices of a site's adjustable components.</summary>
    public int[][] AdjustableOf { get; }

    public int Start(int site) => _start[site];

    public int CountOf(int site) => _start[site + 1] - _start[site];
}
