using System.Text;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

/// <summary>Random damage to the demo plan: the reader answers with a plan or with typed errors, and never throws.</summary>
public class PlanReaderFuzzTests
{
    private static readonly string[] Morsels =
    [
        "", ",", "\"", "\n", "\r", "\t", ":", "- ", "{", "}", "[", "]", "&a ", "*a", "!!int ", "? ", "| ", "> ", "%", "#", "\u0000", "é", "\uFEFF",
        "NaN", "-1", "0", "1e400", "1e-400", "null", "~", "<<: ", "---\n", "...\n", "faults: [1]\n", "\u2028", "99999999999999999999", "08:00", "'",
    ];

    [Fact]
    public void Four_thousand_damaged_plans_end_in_a_plan_or_in_typed_errors()
    {
        var original = PlanFolders.Bytes(PlanFolders.Demo);
        var names = original.Keys.Order(StringComparer.Ordinal).ToArray();
        var random = new Random(20310402);
        var (plans, refused) = (0, 0);
        for (var trial = 0; trial < 4000; trial++)
        {
            var files = new Dictionary<string, byte[]>(original);
            for (var hits = random.Next(1, 4); hits > 0; hits--)
            {
                // Half of the hits go to plan.yaml, whose form offers most ways to go wrong.
                var name = random.Next(2) == 0 ? "plan.yaml" : names[random.Next(names.Length)];
                if (files.TryGetValue(name, out var bytes))
                    Damage(files, name, bytes, random);
            }

            var reading = PlanReader.Read(new MemoryPlanFiles(files));
            Assert.Equal(reading.Plan is null, reading.Errors.Count > 0);
            foreach (var error in reading.Errors)
                AssertWellFormed(error);
            _ = reading.Plan is null ? refused++ : plans++;
        }

        // Both outcomes occur often; otherwise the damage would be too weak or too strong to tell anything.
        Assert.True(plans > 200 && refused > 1500, FormattableString.Invariant($"{plans} plans, {refused} refusals"));
    }

    [Fact]
    public void Random_bytes_for_every_file_end_in_typed_errors()
    {
        var random = new Random(5);
        for (var trial = 0; trial < 500; trial++)
        {
            var files = new PlanTexts().Files.Keys.ToDictionary(name => name, _ =>
            {
                var bytes = new byte[random.Next(200)];
                random.NextBytes(bytes);
                if (random.Next(2) == 0)
                {
                    for (var i = 0; i < bytes.Length; i++)
                        bytes[i] = (byte)(bytes[i] % 96 + 31);
                }

                return bytes;
            });
            var reading = PlanReader.Read(new MemoryPlanFiles(files));
            Assert.Null(reading.Plan);
            Assert.NotEmpty(reading.Errors);
            Assert.All(reading.Errors, AssertWellFormed);
        }
    }

    private static void AssertWellFormed(PlanError error)
    {
        Assert.NotEmpty(error.File);
        Assert.NotEmpty(error.Rule);
        Assert.True(error.Line is null or >= 1);
        Assert.True(error.Column is null or >= 1);
        Assert.DoesNotContain(error.Text, char.IsControl);
        Assert.DoesNotContain("Exception", error.Text, StringComparison.Ordinal);
        if (error.File.StartsWith("loads/", StringComparison.Ordinal))
            Assert.Null(error.Value);
    }

    private static void Damage(Dictionary<string, byte[]> files, string name, byte[] bytes, Random random)
    {
        var at = random.Next(bytes.Length + 1);
        var length = Math.Min(random.Next(random.Next(2) == 0 ? 4 : 40), bytes.Length - at);
        var morsel = Encoding.UTF8.GetBytes(Morsels[random.Next(Morsels.Length)]);
        switch (random.Next(6))
        {
            case 0:
                files[name] = [.. bytes[..at], .. bytes[(at + length)..]];
                break;
            case 1:
                files[name] = [.. bytes[..at], .. morsel, .. bytes[at..]];
                break;
            case 2:
                files[name] = [.. bytes[..at], .. morsel, .. bytes[(at + length)..]];
                break;
            case 3:
                files[name] = [.. bytes[..at], .. bytes[at..(at + length)], .. bytes[at..]];
                break;
            case 4:
                files[name] = [.. bytes[..at], (byte)random.Next(256), .. bytes[Math.Min(at + 1, bytes.Length)..]];
                break;
            default:
                if (random.Next(20) == 0)
                    files.Remove(name);
                else
                    files[name] = [.. bytes[..at]];
                break;
        }
    }
}
