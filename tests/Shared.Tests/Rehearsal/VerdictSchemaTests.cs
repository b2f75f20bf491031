using System.Text.Json;
using System.Text.Json.Nodes;
using Halfvoice.Coordination;
using Halfvoice.Plans;
using Halfvoice.Rehearsal;
using Halfvoice.Tests.Plans;

namespace Halfvoice.Tests.Rehearsal;

/// <summary>deploy/verdict.schema.json says what verdict.json holds, all of it and nothing else.</summary>
public class VerdictSchemaTests
{
    [Fact]
    public void A_verdict_with_every_value_fits() => Assert.Empty(Problems(JsonNode.Parse(Full().ToJson())!));

    [Fact]
    public void A_verdict_without_any_measured_value_fits()
    {
        var bare = Full() with { Passed = false, Seed = null, Options = new Dictionary<string, string>(), Notes = [], Cycles = [Bare()] };
        Assert.Empty(Problems(JsonNode.Parse(bare.ToJson())!));
        Assert.Empty(Problems(JsonNode.Parse((bare with { Cycles = [], Limits = [] }).ToJson())!));
    }

    [Fact]
    public void A_verdict_of_the_real_judge_fits()
    {
        var plan = PlanFolders.Read(PlanFolders.Demo).Plan! with
        {
            Accept = new AcceptSettings { ReserveMw = 20, EpsilonPerDay = 300 },
        };
        foreach (var cycles in new CycleResult[][] { [Measured()], [Bare()], [] })
            Assert.Empty(Problems(JsonNode.Parse((Full() with { Limits = AcceptanceJudge.Judge(plan, cycles), Cycles = cycles }).ToJson())!));
    }

    [Fact]
    public void Every_end_of_a_cycle_is_in_the_schema()
    {
        foreach (var end in Enum.GetNames<CycleEnd>())
            Assert.Empty(Problems(JsonNode.Parse((Full() with { Cycles = [Bare() with { End = end }] }).ToJson())!));
    }

    [Fact]
    public void Every_key_that_is_left_out_or_of_another_kind_is_told()
    {
        var paths = Places(JsonNode.Parse(Full().ToJson())!).ToArray();
        Assert.Equal(9 + 5 + 13, paths.Length);
        foreach (var place in paths)
        {
            var without = JsonNode.Parse(Full().ToJson())!;
            place(without).Remove();
            Assert.Single(Problems(without));
            var other = JsonNode.Parse(Full().ToJson())!;
            place(other).Spoil();
            Assert.NotEmpty(Problems(other));
        }
    }

    [Fact]
    public void A_key_that_nobody_knows_is_told()
    {
        var more = JsonNode.Parse(Full().ToJson())!;
        more["cycles"]![0]!["mood"] = 1;
        Assert.Equal(["$.cycles[0].mood is not known"], Problems(more));
    }

    [Fact]
    public void A_schema_beyond_what_the_check_knows_is_refused_and_not_passed_over()
    {
        using var schema = JsonDocument.Parse("""{ "minimum": 3 }""");
        using var value = JsonDocument.Parse("1");
        Assert.Throws<NotSupportedException>(() => JsonShape.Problems(schema.RootElement, value.RootElement));
    }

    [Fact]
    public void Every_key_of_the_schema_has_a_description()
    {
        using var schema = Schema();
        Described(schema.RootElement, "$");

        static void Described(JsonElement part, string at)
        {
            Assert.True(part.TryGetProperty("description", out var text) && text.GetString()!.Length > 3 || at.EndsWith("[]", StringComparison.Ordinal), at);
            if (part.TryGetProperty("items", out var items))
                Described(items, at + "[]");
            if (!part.TryGetProperty("properties", out var properties))
                return;
            foreach (var property in properties.EnumerateObject())
                Described(property.Value, $"{at}.{property.Name}");
        }
    }

    private static IReadOnlyList<string> Problems(JsonNode verdict)
    {
        using var schema = Schema();
        using var value = JsonDocument.Parse(verdict.ToJsonString());
        return JsonShape.Problems(schema.RootElement, value.RootElement);
    }

    private static JsonDocument Schema() => JsonDocument.Parse(File.ReadAllText(Repository.PathOf("deploy", "verdict.schema.json")));

    private static Verdict Full() => new()
    {
        Passed = true,
        Plan = "Three fords",
        Limits = [new LimitResult("cost_gap", 0.01, 0.002, "fraction", true), new LimitResult("settle_within", 120, null, "s", false)],
        Cycles = [Measured()],
        Seed = 7,
        Commit = "unknown",
        Options = new Dictionary<string, string> { ["plan"] = "x" },
        Notes = ["A note."],
    };

    private static CycleResult Measured() => new()
    {
        Cycle = 1,
        Settled = true,
        End = nameof(CycleEnd.Settled),
        Rounds = 8,
        Seconds = 1.5,
        OptimumPerHour = 100,
        CostPerHour = 101,
        CostGap = 0.01,
        ReserveMw = 2,
        WorstLoading = 0.9,
        WorstLine = "L1",
        Bytes = 1234,
        EpsilonBySite = new Dictionary<string, double> { ["north"] = 0.5 },
    };

    private static CycleResult Bare() => new()
    {
        Cycle = 1,
        Settled = false,
        End = nameof(CycleEnd.NoQuorum),
        Rounds = 1,
        Seconds = 2,
        OptimumPerHour = 100,
        Bytes = 0,
        EpsilonBySite = new Dictionary<string, double>(),
    };

    /// <summary>Every key that the form fixes, as a way to it in another copy; keys by site and option are free.</summary>
    private static IEnumerable<Func<JsonNode, Place>> Places(JsonNode verdict)
    {
        foreach (var (key, value) in verdict.AsObject())
        {
            yield return root => new Place(root.AsObject(), key);
            if (key is not ("limits" or "cycles"))
                continue;
            foreach (var (inner, _) in value![0]!.AsObject())
                yield return root => new Place(root[key]![0]!.AsObject(), inner);
        }
    }

    private sealed record Place(JsonObject Owner, string Key)
    {
        public void Remove() => Assert.True(Owner.Remove(Key));

        /// <summary>Puts a value of a kind there that no key of the form has: a list of lists.</summary>
        public void Spoil() => Owner[Key] = new JsonArray(new JsonArray());
    }
}
