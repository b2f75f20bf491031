namespace Halfvoice.Plans;

/// <summary>One entry of plan key <c>links</c> while it is being read.</summary>
internal sealed class LinkDraft
{
    public string? Profile { get; set; }

    public TimeSpan? RoundTrip { get; set; }

    public TimeSpan? Jitter { get; set; }

    public double? LossFraction { get; set; }

    public double? RateKbitPerS { get; set; }

    public bool IsEmpty => Profile is null && RoundTrip is null && Jitter is null && LossFraction is null && RateKbitPerS is null;

    public LinkSettings Complete(LinkSettings fallback)
    {
        var basis = Profile is null ? fallback : LinkProfiles.ByName[Profile];
        return new LinkSettings(
            Profile,
            RoundTrip ?? basis.RoundTrip,
            Jitter ?? basis.Jitter,
            LossFraction ?? basis.LossFraction,
            RateKbitPerS ?? basis.RateKbitPerS);
    }
}
