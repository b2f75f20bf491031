using System.Globalization;

namespace Halfvoice.Plans;

/// <summary>Collects errors and warnings of one reading, bounded per file and in all.</summary>
internal sealed class PlanProblems
{
    private readonly List<PlanError> _errors = [];
    private readonly List<PlanWarning> _warnings = [];

    public int Count => _errors.Count;

    public bool IsFull => _errors.Count >= PlanFileRules.MaxErrors;

    public void Add(PlanError error) => _errors.Add(error);

    public void Warn(string file, int? line, string message) => _warnings.Add(new PlanWarning(file, line, message));

    public FileProblems In(string file) => new(this, file);

    public PlanReading ToReading(Plan? plan) => new(
        _errors.Count == 0 ? plan : null,
        [
            .. _errors.OrderBy(error => error.File, StringComparer.Ordinal)
                .ThenBy(error => error.Line ?? 0)
                .ThenBy(error => error.Column ?? 0),
        ],
        _warnings);
}

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
