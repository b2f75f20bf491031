namespace Halfvoice.Privacy;

/// <summary>Which theorem a sensitivity rests on.</summary>
public enum SensitivityMethod
{
    /// <summary>An injection moves by at most as much as the load (proven in <c>injection.proof.md</c>).</summary>
    LoadChange,

    /// <summary>The exact maximum over every set of lines at their limit and of marginal buses.</summary>
    EveryActiveSet,

    /// <summary>A bound on that maximum by the number of lines at their limit, for sites with too many lines to enumerate.</summary>
    RelaxedActiveSets,

    /// <summary>Strong convexity and the unserved-load price: holds for every site, seldom tight.</summary>
    UnservedPrice,
}

/// <summary>A proven bound on how far a site's whole answer moves, in L1, between adjacent loads.</summary>
/// <param name="L1">In the answer's unit (MW or rad), at least 0.</param>
/// <param name="Method">The theorem behind it: the least of those that apply.</param>
public sealed record SensitivityBound(double L1, SensitivityMethod Method)
{
    /// <summary>The method in words, for reports.</summary>
    public string Words => Method switch
    {
        SensitivityMethod.LoadChange => "the load change itself",
        SensitivityMethod.EveryActiveSet => "exact over every active set",
        SensitivityMethod.RelaxedActiveSets => "proven relaxation over active sets",
        SensitivityMethod.UnservedPrice => "strong convexity and the unserved-load price",
        _ => throw new InvalidOperationException($"The sensitivity method {Method} has no words."),
    };

    /// <summary>The smaller of two bounds that both hold.</summary>
    internal static SensitivityBound Least(SensitivityBound a, SensitivityBound? b) => b is null || a.L1 <= b.L1 ? a : b;
}
