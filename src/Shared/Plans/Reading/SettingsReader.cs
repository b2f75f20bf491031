namespace Halfvoice.Plans;

/// <summary>Reads plan.yaml into a draft; every key by the table <see cref="PlanKeys"/>.</summary>
internal sealed class SettingsReader
{
    private const string AnySite = "links.sites.<site>";

    private readonly SettingsDraft _draft = new();
    private readonly FileProblems _problems;
    private readonly HashSet<string> _refused = new(StringComparer.Ordinal);

    private SettingsReader(FileProblems problems) => _problems = problems;

    /// <summary>The settings, or null where the file cannot be read at all; errors are noted either way.</summary>
    public static SettingsDraft? Read(IPlanFiles files, FileProblems problems)
    {
        var content = files.Read(PlanFileRules.Yaml, PlanFileRules.MaxYamlBytes);
        if (content.Bytes is not { } bytes)
        {
            problems.Whole(content.Problem ?? "cannot be read");
            return null;
        }

        if (YamlTree.Read(bytes, problems) is not { } top)
            return null;
        var reader = new SettingsReader(problems);
        reader.Section(top, "", "");
        reader.Required("name", reader._draft.Name is not null);
        reader.Required("base_mva", reader._draft.BaseMva is not null);
        return reader._draft;
    }

    private void Required(string key, bool isThere)
    {
        if (!isThere && !_refused.Contains(key))
            _problems.Add(null, null, key, null, "is missing: every plan needs it");
    }

    /// <summary>Reads a map. <paramref name="path"/> is the path in the table, <paramref name="shown"/> the one to tell people.</summary>
    private void Section(YamlMap map, string path, string shown)
    {
        var seen = new Dictionary<string, int>(StringComparer.Ordinal);
        foreach (var (key, value) in map.Entries)
        {
            if (_problems.IsFull)
            {
                _problems.StoppedAt(key.Line);
                return;
            }

            if (!seen.TryAdd(key.Text, key.Line))
                _problems.Add(key.Line, key.Column, "key", shown + key.Text, $"is there twice, first in line {seen[key.Text]}");
            else
                Entry(key, value, path + key.Text, shown + key.Text, path);
        }
    }

    private void Entry(YamlScalar key, YamlPart value, string path, string shown, string parent)
    {
        // A dotted key would otherwise be taken for the key of a section.
        if (key.Text.Contains('.', StringComparison.Ordinal))
            Unknown(key, shown, parent);
        else if (PlanKeys.ByPath.TryGetValue(path, out var known))
            Value(known, value, shown);
        else if (path == "faults")
            Faults(value);
        else if (path == "links.sites")
            Sites(value);
        else if (PlanKeys.All.Any(candidate => candidate.Path.StartsWith(path + ".", StringComparison.Ordinal)))
            Subsection(value, path, shown);
        else
            Unknown(key, shown, parent);
    }

    private void Value(PlanKey known, YamlPart value, string shown)
    {
        var (text, rule) = value switch
        {
            YamlScalar { IsEmpty: true } => (null, "has no value: it is " + known.Range),
            YamlScalar scalar => (scalar.Text, known.Apply(_draft, scalar.Text)),
            YamlList => (null, "must be a single value, not a list: it is " + known.Range),
            _ => (null, "must be a single value, not keys: it is " + known.Range),
        };
        if (rule is null)
            return;
        _refused.Add(known.Path);
        _problems.Add(value.Line, value.Column, shown, text, rule);
    }

    private void Subsection(YamlPart value, string path, string shown)
    {
        if (value is not YamlMap map)
        {
            NeedsKeys(value, path, shown);
            return;
        }

        if (path == "privacy")
            _draft.Privacy = _draft.Privacy with { Stated = true };
        if (path == "links.default")
            _draft.Link = _draft.DefaultLink;
        Section(map, path + ".", shown + ".");
    }

    private void Sites(YamlPart value)
    {
        if (value is not YamlMap map)
        {
            _problems.Add(value.Line, value.Column, "links.sites", null, "must have the names of sites as keys");
            return;
        }

        var seen = new HashSet<string>(StringComparer.Ordinal);
        foreach (var (key, entry) in map.Entries)
        {
            if (_problems.IsFull)
                return;
            var shown = "links.sites." + PlanError.Quotable(key.Text);
            if (!seen.Add(key.Text))
            {
                _problems.Add(key.Line, key.Column, "links.sites", key.Text, "is there twice");
                continue;
            }

            _draft.Link = new LinkDraft();
            _draft.SiteLinks.Add((key.Text, key.Line, key.Column, _draft.Link));
            if (entry is YamlMap link)
                Section(link, AnySite + ".", shown + ".");
            else
                NeedsKeys(entry, AnySite, shown);
        }
    }

    private void NeedsKeys(YamlPart value, string path, string shown) => _problems.Add(
        value.Line, value.Column, shown, null, "must have keys of its own: " + string.Join(", ", KeysUnder(path + ".")));

    private void Faults(YamlPart value)
    {
        if (value is YamlList { Items.Count: 0 })
            return;
        var rule = value is YamlList
            ? "asks for faults, but this version cannot inject any and would rehearse without them: remove the entries"
            : "must be a list; this version takes only the empty one, []";
        _problems.Add(value.Line, value.Column, "faults", null, rule);
    }

    private void Unknown(YamlScalar key, string shown, string parent)
    {
        var siblings = KeysUnder(parent).ToArray();
        var near = NearestName.Of(key.Text, siblings);
        _problems.Add(key.Line, key.Column, "key", shown, near is null
            ? "is not known: known here are " + string.Join(", ", siblings)
            : $"is not known: did you mean '{near}'?");
    }

    private static IEnumerable<string> KeysUnder(string prefix) => PlanKeys.All.Select(key => key.Path)
        .Concat(["links.sites.", "faults."])
        .Where(path => path.StartsWith(prefix, StringComparison.Ordinal))
        .Select(path => path[prefix.Length..].Split('.')[0])
        .Distinct(StringComparer.Ordinal);
}
