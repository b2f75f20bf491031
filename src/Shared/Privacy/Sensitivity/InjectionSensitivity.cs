namespace Halfvoice.Privacy;

/// <summary>
/// Scheme <c>injection</c>: x = argmin c(x + d) + u·x + ρ/2·(x − z)² is a proximal step, so dx/dd lies in [−1, 0] at each
/// bus for every ask, cost and plant limit, and the L1 change of a site's answer is at most the L1 change of its load,
/// whether it has one bus or several. Proof: <c>injection.proof.md</c>.
/// </summary>
public static class InjectionSensitivity
{
    /// <param name="adjacencyMw">The load change that must stay hidden, L1, MW, above 0.</param>
    public static SensitivityBound For(double adjacencyMw)
    {
        Adjacency.Check(adjacencyMw);
        return new SensitivityBound(adjacencyMw, SensitivityMethod.LoadChange);
    }
}
