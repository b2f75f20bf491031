using System.Text.Json;

namespace Halfvoice.Tests.Rehearsal;

/// <summary>
/// Checks a JSON value against a schema, as far as the schemas of this repository go: type, required, properties,
/// additionalProperties, items and enum of JSON Schema 2020-12, with annotations passed over. Any other keyword is refused, so
/// that no rule is ever passed over in silence.
/// </summary>
internal static class JsonShape
{
    private static readonly string[] Annotations = ["$schema", "title", "description"];

    /// <summary>What is wrong, one line each with the place of the value; empty where it fits.</summary>
    public static IReadOnlyList<string> Problems(JsonElement schema, JsonElement value)
    {
        var found = new List<string>();
        Check(schema, value, "$", found);
        return found;
    }

    private static void Check(JsonElement schema, JsonElement value, string at, List<string> found)
    {
        foreach (var rule in schema.EnumerateObject())
        {
            switch (rule.Name)
            {
                case "type":
                    if (!Types(rule.Value).Any(type => Is(type, value)))
                        found.Add($"{at} is {value.ValueKind}, not {string.Join(" or ", Types(rule.Value))}");
                    break;
                case "enum":
                    if (!rule.Value.EnumerateArray().Any(allowed => JsonElement.DeepEquals(allowed, value)))
                        found.Add($"{at} is {value.GetRawText()}, none of {rule.Value.GetRawText()}");
                    break;
                case "required":
                    if (value.ValueKind == JsonValueKind.Object)
                        found.AddRange(Names(rule.Value).Where(name => !value.TryGetProperty(name, out _)).Select(name => $"{at}.{name} is missing"));
                    break;
                case "items":
                    CheckItems(rule.Value, value, at, found);
                    break;
                case "properties" or "additionalProperties":
                    break;
                default:
                    if (!Annotations.Contains(rule.Name, StringComparer.Ordinal))
                        throw new NotSupportedException($"The schema uses '{rule.Name}', which this check does not know.");
                    break;
            }
        }

        CheckMembers(schema, value, at, found);
    }

    private static void CheckItems(JsonElement schema, JsonElement value, string at, List<string> found)
    {
        if (value.ValueKind != JsonValueKind.Array)
            return;
        foreach (var (i, item) in value.EnumerateArray().Index())
            Check(schema, item, $"{at}[{i}]", found);
    }

    private static void CheckMembers(JsonElement schema, JsonElement value, string at, List<string> found)
    {
        if (value.ValueKind != JsonValueKind.Object)
            return;
        foreach (var member in value.EnumerateObject())
        {
            if (schema.TryGetProperty("properties", out var known) && known.TryGetProperty(member.Name, out var own))
                Check(own, member.Value, $"{at}.{member.Name}", found);
            else if (schema.TryGetProperty("additionalProperties", out var other) && other.ValueKind == JsonValueKind.Object)
                Check(other, member.Value, $"{at}.{member.Name}", found);
            else if (other.ValueKind == JsonValueKind.False)
                found.Add($"{at}.{member.Name} is not known");
        }
    }

    private static string[] Types(JsonElement type) => type.ValueKind == JsonValueKind.Array ? Names(type) : [type.GetString()!];

    private static string[] Names(JsonElement array) => [.. array.EnumerateArray().Select(name => name.GetString()!)];

    private static bool Is(string type, JsonElement value) => type switch
    {
        "null" => value.ValueKind == JsonValueKind.Null,
        "boolean" => value.ValueKind is JsonValueKind.True or JsonValueKind.False,
        "string" => value.ValueKind == JsonValueKind.String,
        "array" => value.ValueKind == JsonValueKind.Array,
        "object" => value.ValueKind == JsonValueKind.Object,
        "number" => value.ValueKind == JsonValueKind.Number,
        "integer" => value.ValueKind == JsonValueKind.Number && value.TryGetDouble(out var number) && number == Math.Floor(number),
        _ => throw new NotSupportedException($"The schema names the type '{type}'."),
    };
}
