using Halfvoice.Plans;

namespace Halfvoice.Coordination;

/// <summary>Makes the site's half of the scheme that a setup names.</summary>
public static class SiteSchemes
{
    public static ISiteScheme Create(SiteSetup setup) => setup.Scheme switch
    {
        SchemeKind.Injection => new InjectionSite(setup),
        SchemeKind.Angle => new AngleSite(setup),
        _ => throw new ArgumentOutOfRangeException(nameof(setup), setup.Scheme, "There is no such scheme."),
    };
}
