using Halfvoice.Plans;
using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

public class AnswerDerivationTests
{
    private static readonly AnswerBounds HundredMw = AnswerBounds.Symmetric(1, 100);

    private static AnswerDerivation Of(PrivacySettings privacy, int rounds, bool once = false)
    {
        var allowance = ScopeAllowance.For(privacy, rounds, TimeSpan.FromMinutes(5), 3, once);
        return AnswerDerivation.For(privacy, allowance, InjectionSensitivity.For(privacy.AdjacencyMw), HundredMw, "MW");
    }

    [Fact]
    public void The_words_show_every_step_to_the_scale()
    {
        var derivation = Of(new PrivacySettings { AdjacencyMw = 0.1, Epsilon = 4 }, 40);
        Assert.Equal(
            "ε 4 a cycle ÷ 40 answers = 0.1 an answer; adjacency 0.1 MW ÷ 0.1 → Laplace scale 1 MW; "
            + "a cycle of 40 answers: ε 4; a day of 288 cycles: ε 1152",
            derivation.Words);
    }

    [Fact]
    public void A_day_scope_never_promises_more_than_its_allowance()
    {
        var derivation = Of(new PrivacySettings { Epsilon = 4, Scope = PrivacyScope.Campaign }, 40);
        Assert.Equal(4m, derivation.DayTotal);
        Assert.Contains("÷ 120 answers", derivation.Words);
        Assert.StartsWith("ε 4 an answer;", Of(new PrivacySettings { Epsilon = 4, Scope = PrivacyScope.Round }, 40).Words);
    }

    [Fact]
    public void An_angle_site_names_its_sensitivity_and_method()
    {
        var privacy = new PrivacySettings();
        var allowance = ScopeAllowance.For(privacy, 10, TimeSpan.FromMinutes(5), 1, false);
        var bound = new SensitivityBound(0.002, SensitivityMethod.EveryActiveSet);
        var words = AnswerDerivation.For(privacy, allowance, bound, AnswerBounds.Symmetric(3, 3.2), "rad").Words;
        Assert.Contains("adjacency 1 MW moves the answer by at most 0.002 rad (exact over every active set)", words);
        Assert.Contains("Laplace scale 0.02 rad", words);
    }

    [Fact]
    public void Mechanism_none_has_no_scale_to_derive()
    {
        var privacy = new PrivacySettings { Mechanism = MechanismKind.None };
        Assert.Throws<ArgumentException>(() => Of(privacy, 4));
    }
}
