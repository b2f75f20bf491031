using System.Text;
using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

/// <summary>Files that are no plan files at all: wrong encodings, garbage, too large.</summary>
public class BadFileTests
{
    [Fact]
    public void An_empty_folder_says_what_a_plan_folder_holds()
    {
        var reading = PlanReader.Read(new MemoryPlanFiles(new Dictionary<string, byte[]>()));
        Assert.StartsWith(".: is empty: a plan folder holds plan.yaml, grid/buses.csv", Assert.Single(reading.Errors).Text, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("plan.yaml")]
    [InlineData("grid/buses.csv")]
    [InlineData("grid/lines.csv")]
    [InlineData("grid/generators.csv")]
    [InlineData("loads/south.csv")]
    public void Text_in_another_encoding_is_an_error_with_line_and_byte_offset(string file)
    {
        var files = new PlanTexts().Files.ToDictionary(pair => pair.Key, pair => Encoding.UTF8.GetBytes(pair.Value));
        var original = new PlanTexts().Files[file];
        var second = original.IndexOf('\n', StringComparison.Ordinal) + 1;

        files[file] = [.. Encoding.UTF8.GetBytes(original[..second]), .. Encoding.Latin1.GetBytes("é" + original[second..])];
        Assert.StartsWith(
            FormattableString.Invariant($"{file}:2: is not UTF-8 text: an invalid byte at byte offset {second}"),
            Assert.Single(PlanReader.Read(new MemoryPlanFiles(files)).Errors).Text,
            StringComparison.Ordinal);

        files[file] = [0xFF, 0xFE, .. Encoding.Unicode.GetBytes(original)];
        Assert.Equal($"{file}:1:1: is UTF-16 text: save it as UTF-8", Assert.Single(PlanReader.Read(new MemoryPlanFiles(files)).Errors).Text);

        files[file] = Encoding.Unicode.GetBytes(original);
        Assert.StartsWith(
            $"{file}:1: is not UTF-8 text: a zero byte at byte offset 1",
            Assert.Single(PlanReader.Read(new MemoryPlanFiles(files)).Errors).Text,
            StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("random bytes")]
    [InlineData("random letters")]
    [InlineData("one endless line")]
    [InlineData("commas")]
    [InlineData("quotes")]
    [InlineData("rows of garbage under a good header")]
    [InlineData("good rows without end")]
    public void Fifty_megabytes_of_garbage_end_in_a_few_typed_errors(string kind)
    {
        var garbage = Garbage(kind, 50_000_000);
        var files = new PlanTexts().Files.ToDictionary(pair => pair.Key, pair => Encoding.UTF8.GetBytes(pair.Value));
        foreach (var file in new[] { "grid/buses.csv", "grid/lines.csv", "loads/south.csv" })
        {
            var before = GC.GetAllocatedBytesForCurrentThread();
            var reading = PlanReader.Read(new MemoryPlanFiles(new Dictionary<string, byte[]>(files) { [file] = garbage }));
            var allocated = GC.GetAllocatedBytesForCurrentThread() - before;
            Assert.Null(reading.Plan);
            Assert.Contains(reading.Errors, error => error.File == file);
            Assert.InRange(reading.Errors.Count(error => error.File == file), 1, PlanFileRules.MaxErrorsPerFile + 8);
            Assert.InRange(reading.ErrorLines().Count(text => text.StartsWith(file, StringComparison.Ordinal)), 1, 51);
            Assert.True(allocated < 500_000_000, FormattableString.Invariant($"{file} took {allocated} bytes of allocation."));
        }
    }

    [Fact]
    public void A_file_above_its_cap_is_not_read()
    {
        var files = new PlanTexts().Files.ToDictionary(pair => pair.Key, pair => Encoding.UTF8.GetBytes(pair.Value));
        files["grid/lines.csv"] = new byte[PlanFileRules.MaxCsvBytes + 1];
        files["plan.yaml"] = new byte[PlanFileRules.MaxYamlBytes + 1];
        Assert.Equal(
            ["grid/lines.csv: is 64.0 MiB large; at most 64 MiB are read", "plan.yaml: is 1.0 MiB large; at most 1 MiB are read"],
            PlanReader.Read(new MemoryPlanFiles(files)).Errors.Select(error => error.Text));
    }

    [Fact]
    public void Printing_stops_after_fifty_errors_of_a_file_and_counts_the_rest()
    {
        var rows = string.Concat(Enumerable.Range(0, 120).Select(i => FormattableString.Invariant($"N{i},A,C,zero,\n")));
        var lines = new PlanTexts().With("grid/lines.csv", "line,from_bus,to_bus,reactance_pu,limit_mw\n" + rows).Read().ErrorLines().ToArray();
        Assert.Equal(51, lines.Length);
        Assert.Equal("grid/lines.csv: and 70 more errors in this file", lines[^1]);
    }

    [Fact]
    public void What_an_error_quotes_is_short_and_on_one_line()
    {
        var error = new PlanTexts()
            .Replacing("grid/lines.csv", "L1,A,B,0.1,50", "L1,A,B,\"x\n\u001b[31m" + new string('y', 300) + "\",50")
            .OnlyError();
        Assert.DoesNotContain(error, char.IsControl);
        Assert.Contains("'x??[31myyy", error, StringComparison.Ordinal);
        Assert.InRange(error.Length, 50, 200);
    }

    private static byte[] Garbage(string kind, int length)
    {
        var bytes = new byte[length];
        var random = new Random(7);
        switch (kind)
        {
            case "random bytes":
                random.NextBytes(bytes);
                break;
            case "random letters":
                for (var i = 0; i < length; i++)
                    bytes[i] = (byte)(random.Next(20) == 0 ? '\n' : random.Next(32, 127));
                break;
            case "one endless line":
                Array.Fill(bytes, (byte)'x');
                break;
            case "commas":
                Array.Fill(bytes, (byte)',');
                break;
            case "quotes":
                Array.Fill(bytes, (byte)'"');
                break;
            default:
                var header = "bus,site,line,from_bus,to_bus,reactance_pu,limit_mw,load_mw,time\n"u8;
                var row = kind[0] == 'g' ? "B,s,L,A,B,0.1,5,1,08:00\n"u8 : "?,?\n"u8;
                header.CopyTo(bytes);
                for (var i = 0; i < length - header.Length; i++)
                    bytes[header.Length + i] = row[i % row.Length];
                break;
        }

        return bytes;
    }
}
