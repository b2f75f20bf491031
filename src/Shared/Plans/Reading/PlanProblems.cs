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
