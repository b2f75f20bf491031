using System.Security.Cryptography;
using System.Text;
using System.Text.RegularExpressions;

namespace Halfvoice.Tests.Privacy;

/// <summary>
/// A proof names the code it covers with its SHA-256 (line ends as LF). Changed code makes its proof stale until someone
/// has read the one against the other and entered the new sums.
/// </summary>
public partial class ProofTests
{
    private static readonly string[] Sections =
        ["## Assumptions", "Compiler-verified:", "Caller-verified", "## Claim", "## Argument", "## Code covered"];

    [Fact]
    public void Every_proof_has_its_sections_and_matches_the_code_it_covers()
    {
        var stale = new StringBuilder();
        foreach (var proof in Proofs())
        {
            var text = File.ReadAllText(proof);
            foreach (var section in Sections)
                Assert.True(text.Contains(section, StringComparison.Ordinal), $"{Name(proof)} has no part '{section}'.");
            Assert.NotEmpty(Covered(proof));
            foreach (var (code, sum) in Covered(proof))
            {
                Assert.True(File.Exists(code), $"{Name(proof)} covers {Name(code)}, which is not there.");
                if (sum != Sum(code))
                    stale.AppendLine($"{Name(proof)}: read it against {Name(code)}, then enter {Sum(code)}");
            }
        }

        Assert.True(stale.Length == 0, stale.ToString());
    }

    [Fact]
    public void All_privacy_code_is_covered_by_a_proof()
    {
        var covered = Proofs().SelectMany(proof => Covered(proof).Select(row => row.Code)).ToHashSet();
        var all = Directory.EnumerateFiles(Root(), "*.cs", SearchOption.AllDirectories);
        var open = all.Where(code => !covered.Contains(code)).Select(Name);
        Assert.Empty(open);
    }

    [Fact]
    public void Every_mechanism_has_a_folder_with_one_proof()
    {
        var folders = Directory.EnumerateDirectories(Path.Combine(Root(), "Mechanisms")).ToArray();
        Assert.Contains(folders, folder => Path.GetFileName(folder) == "None");
        Assert.Contains(folders, folder => Path.GetFileName(folder) == "PerRound");
        Assert.All(folders, folder => Assert.Single(Directory.EnumerateFiles(folder, "*.proof.md")));
    }

    [Fact]
    public void A_changed_character_makes_a_proof_stale_and_a_line_end_does_not()
    {
        Assert.NotEqual(Sum("a\nb"u8.ToArray()), Sum("a\nc"u8.ToArray()));
        Assert.Equal(Sum("a\nb"u8.ToArray()), Sum("a\r\nb"u8.ToArray()));
    }

    [GeneratedRegex(@"^\| `(?<code>[^`]+\.cs)` \| `(?<sum>[0-9a-f]{64})` \|$", RegexOptions.Multiline)]
    private static partial Regex Row();

    private static (string Code, string Sum)[] Covered(string proof)
    {
        var folder = Path.GetDirectoryName(proof)!;
        var text = File.ReadAllText(proof).Replace("\r\n", "\n", StringComparison.Ordinal);
        return [.. Row().Matches(text).Select(row =>
            (Path.GetFullPath(Path.Combine(folder, row.Groups["code"].Value)), row.Groups["sum"].Value))];
    }

    private static string Sum(string code) => Sum(File.ReadAllBytes(code));

    private static string Sum(byte[] content) =>
        Convert.ToHexStringLower(SHA256.HashData(content.Where(b => b != (byte)'\r').ToArray()));

    private static string[] Proofs() => Directory.GetFiles(Root(), "*.proof.md", SearchOption.AllDirectories);

    private static string Name(string path) => Path.GetRelativePath(Root(), path).Replace('\\', '/');

    private static string Root() => Repository.PathOf("src", "Shared", "Privacy");
}
