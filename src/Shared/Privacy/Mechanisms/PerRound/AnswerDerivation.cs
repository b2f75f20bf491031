using System.Globalization;
using Halfvoice.Plans;

namespace Halfvoice.Privacy;

/// <summary>
/// Where a site's noise scale comes from, step by step, for <c>check</c>, the report and the site's own records.
/// Everything in it is public.
/// </summary>
/// <param name="Allowance">How the plan's ε is shared out.</param>
/// <param name="Sensitivity">The proven L1 bound.</param>
/// <param name="Calibration">Lattice and scale.</param>
/// <param name="AdjacencyMw">The load change that stays hidden.</param>
/// <param name="Unit">The answer's unit, MW or rad.</param>
public sealed record AnswerDerivation(
    ScopeAllowance Allowance, SensitivityBound Sensitivity, NoiseCalibration Calibration, double AdjacencyMw, string Unit)
{
    /// <summary>Derives the noise of one site's answers.</summary>
    /// <param name="privacy">The plan's privacy section; its mechanism is <c>per-round</c>.</param>
    /// <param name="allowance">From the same section.</param>
    /// <param name="sensitivity">From the same section's adjacency.</param>
    /// <param name="bounds">Public bounds on the answer.</param>
    /// <param name="unit">MW or rad.</param>
    public static AnswerDerivation For(
        PrivacySettings privacy, ScopeAllowance allowance, SensitivityBound sensitivity, AnswerBounds bounds, string unit)
    {
        ArgumentNullException.ThrowIfNull(privacy);
        ArgumentNullException.ThrowIfNull(allowance);
        if (privacy.Mechanism != MechanismKind.PerRound)
            throw new ArgumentException("Only mechanism per-round has a noise scale for each answer.", nameof(privacy));
        var calibration = NoiseCalibration.For(sensitivity, bounds, allowance.EpsilonUnitsEach);
        return new AnswerDerivation(allowance, sensitivity, calibration, privacy.AdjacencyMw, unit);
    }

    /// <summary>The derivation in one line.</summary>
    public string Words => string.Join("; ", ShareWords, ScaleWords, SumWords);

    private string ShareWords => Allowance.Scope == PrivacyScope.Round
        ? $"ε {Text(Stated)} an answer"
        : $"ε {Text(Stated)} {PeriodWord} ÷ {Allowance.AnswersSharing} answers = {Text(Allowance.EpsilonPerAnswer)} an answer";

    private string ScaleWords => Sensitivity.Method == SensitivityMethod.LoadChange
        ? $"adjacency {Text(AdjacencyMw)} MW ÷ {Text(Allowance.EpsilonPerAnswer)} → Laplace scale {Text(Calibration.Scale)} {Unit}"
        : $"adjacency {Text(AdjacencyMw)} MW moves the answer by at most {Text(Sensitivity.L1)} {Unit} ({Sensitivity.Words}) "
            + $"÷ {Text(Allowance.EpsilonPerAnswer)} → Laplace scale {Text(Calibration.Scale)} {Unit}";

    private string SumWords =>
        $"a cycle of {Allowance.AnswersPerCycle} answers: ε {Text(Allowance.EpsilonPerCycle)}; "
        + $"a day of {Allowance.CyclesPerDay} cycles: ε {Text(DayTotal)}";

    /// <summary>What a day can spend: the allowance stops it where the scope is the day or the campaign.</summary>
    public decimal DayTotal => Allowance.Scope is PrivacyScope.Day or PrivacyScope.Campaign
        ? Math.Min(Allowance.EpsilonPerDay, Stated)
        : Allowance.EpsilonPerDay;

    private decimal Stated => EpsilonUnits.ToDecimal(Allowance.StatedUnits);

    private string PeriodWord => Allowance.Scope switch
    {
        PrivacyScope.Cycle => "a cycle",
        PrivacyScope.Day => "a day",
        _ => "a campaign",
    };

    private static string Text(decimal value) => value.ToString("0.############", CultureInfo.InvariantCulture);

    private static string Text(double value) => value.ToString("G6", CultureInfo.InvariantCulture);
}
