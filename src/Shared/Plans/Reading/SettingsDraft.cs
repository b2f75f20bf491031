namespace Halfvoice.Plans;

/// <summary>The settings of plan.yaml while they are being read; starts out with every default.</summary>
internal sealed class SettingsDraft
{
    public string? Name { get; set; }

    public double? BaseMva { get; set; }

    public TimeSpan Interval { get; set; } = TimeSpan.FromMinutes(5);

    public int Cycles { get; set; } = 1;

    public SchemeSettings Scheme { get; set; } = new();

    public StopSettings Stop { get; set; } = new();

    public PrivacySettings Privacy { get; set; } = new();

    public RoundSettings Rounds { get; set; } = new();

    public AcceptSettings Accept { get; set; } = new();

    public LinkDraft DefaultLink { get; } = new();

    /// <summary>The links of single sites, in file order, with the place of the key.</summary>
    public List<(string Site, int Line, int Column, LinkDraft Link)> SiteLinks { get; } = [];

    /// <summary>The link whose keys are being read.</summary>
    public LinkDraft Link { get; set; } = new();

    /// <summary>Fills what an entry leaves open: from its profile, else from the default link, else from the profile local.</summary>
    public LinkPlan Links()
    {
        var standard = DefaultLink.Complete(LinkProfiles.Local);
        if (DefaultLink.IsEmpty)
            standard = LinkProfiles.Local;
        return new LinkPlan
        {
            Default = standard,
            Sites = SiteLinks.ToDictionary(entry => entry.Site, entry => entry.Link.Complete(standard), StringComparer.Ordinal),
        };
    }
}
