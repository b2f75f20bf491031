using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>The problems of one file. In a load file no value is ever kept: loads are private.</summary>
internal sealed class FileProblems(PlanProblems all, string file)
{
    private readonly bool _private = file.StartsWith(PlanFileRules.LoadFolder, StringComparison.Ordinal);

    public string File => file;

    public int Count { get; private set; }

    /// <summary>True when so much is wrong that the rest of the file is not worth reading.</summary>
    public bool IsFull => Count >= PlanFileRules.MaxErrorsPerFile || all.IsFull;

    public void Add(int? line, int? column, string? field, string? value, string rule)
    {
        Count++;
        var hidden = _private && value is not null;
        all.Add(new PlanError(file, line, column, hidden || value is null ? null : PlanError.Quotable(value), rule, field, hidden));
    }

    public void Whole(string rule) => Add(null, null, null, null, rule);

    public void Warn(int? line, string message) => all.Warn(file, line, message);

    /// <summary>Says that reading stopped early because of too many errors.</summary>
    public void StoppedAt(int line) => all.Add(new PlanError(file, line, null, null, string.Create(
        CultureInfo.InvariantCulture,
        $"{Count} errors so far: the rest of this file was not read")));
}
