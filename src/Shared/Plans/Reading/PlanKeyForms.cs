using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>Makes the entries of <see cref="PlanKeys"/>: for each form of value one rule, whose text is also the documented range.</summary>
internal static class PlanKeyForms
{
    private const string DurationUnit = "duration: 600ms, 2s, 5m, 1h";
    private const string FractionUnit = "fraction: 0.5% or 0.005";

    /// <param name="word">A word that may stand instead of a number and is set as null; null where none may.</param>
    public static PlanKey Number(
        string path, string unit, NumberRule rule, string standard, string meaning, Action<SettingsDraft, double?> set, string? word = null)
    {
        var orWord = word is null ? "" : ", or " + word;
        return new PlanKey(path, unit, rule.Range + orWord, standard, meaning)
        {
            Apply = (draft, text) =>
            {
                if (text == word)
                {
                    set(draft, null);
                    return null;
                }

                if (!Quantity.TryNumber(text, out var value))
                    return $"must be a number {rule.Range}{orWord}";
                if (rule.Broken(value) is { } broken)
                    return double.IsFinite(value) ? broken + orWord : $"{broken}: {rule.Range}{orWord}";
                set(draft, value);
                return null;
            },
        };
    }

    public static PlanKey Whole(string path, int least, int most, string standard, string meaning, Action<SettingsDraft, int> set)
    {
        var range = string.Create(CultureInfo.InvariantCulture, $"{least} to {most:#,##0}");
        return new PlanKey(path, "whole number", range, standard, meaning)
        {
            Apply = (draft, text) =>
            {
                var isWhole = int.TryParse(text, NumberStyles.AllowLeadingSign, CultureInfo.InvariantCulture, out var value);
                if (!isWhole || value < least || value > most)
                    return "must be a whole number, " + range;
                set(draft, value);
                return null;
            },
        };
    }

    public static PlanKey Fraction(string path, NumberRule rule, string standard, string meaning, Action<SettingsDraft, double> set) =>
        new(path, FractionUnit, rule.Range, standard, meaning)
        {
            Apply = (draft, text) =>
            {
                if (!Quantity.TryFraction(text, out var value))
                    return $"must be a fraction such as 0.005 or 0.5%, {rule.Range}";
                if (rule.Broken(value) is { } broken)
                    return double.IsFinite(value) ? $"{broken} (a fraction; 1 is 100%)" : $"{broken}: {rule.Range}";
                set(draft, value);
                return null;
            },
        };

    public static PlanKey Duration(
        string path, string least, string most, string standard, string meaning, Action<SettingsDraft, TimeSpan> set)
    {
        if (!Quantity.TryDuration(least, out var low) || !Quantity.TryDuration(most, out var high))
            throw new ArgumentException("A duration in the key table cannot be read.");
        var range = $"{least} to {most}";
        return new PlanKey(path, DurationUnit, range, standard, meaning)
        {
            Apply = (draft, text) =>
            {
                if (!Quantity.TryDuration(text, out var value))
                    return $"must be a duration with its unit, such as 600ms, 2s, 5m or 1h: {range}";
                if (value < low || value > high)
                    return "must be a duration of " + range;
                set(draft, value);
                return null;
            },
        };
    }

    public static PlanKey Choice<T>(
        string path, (string Name, T Value)[] choices, string standard, string meaning, Action<SettingsDraft, T> set)
    {
        var range = "one of " + string.Join(", ", choices.Select(choice => choice.Name));
        return new PlanKey(path, "name", range, standard, meaning)
        {
            Apply = (draft, text) =>
            {
                var index = Array.FindIndex(choices, choice => choice.Name == text);
                if (index < 0)
                    return $"must be {range}{NearestName.Hint(text, choices.Select(choice => choice.Name))}";
                set(draft, choices[index].Value);
                return null;
            },
        };
    }
}
