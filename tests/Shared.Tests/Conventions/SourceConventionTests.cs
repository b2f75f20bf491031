namespace Halfvoice.Tests.Conventions;

/// <summary>The written files keep the rules. That each rule can be broken is shown by <see cref="RuleTests"/>.</summary>
public class SourceConventionTests
{
    [Fact]
    public void No_function_is_longer_than_70_lines() => Keep(Rules.LongFunctions, ".cs");

    [Fact]
    public void No_file_is_longer_than_400_lines() => Keep(Rules.LongFile, ".cs", ".py", ".proto");

    [Fact]
    public void No_line_is_wider_than_160_columns() => Keep(Rules.WideLines, ".cs", ".py", ".proto", ".csproj");

    [Fact]
    public void Nothing_is_left_unfinished() => Keep(Rules.UnfinishedWork, ".cs", ".py", ".proto", ".csproj", ".md");

    [Fact]
    public void No_test_sleeps() => Keep(Rules.Sleeps, ".cs");

    [Fact]
    public void No_file_names_a_path_of_one_machine() => Keep(Rules.MachinePaths, ".cs", ".py", ".proto", ".csproj", ".md", ".json", ".yaml");

    [Fact]
    public void No_file_names_a_package_registry() => Keep(Rules.RegistryHosts, ".cs", ".py", ".proto", ".csproj", ".md", ".json", ".yaml");

    [Fact]
    public void A_file_of_the_product_holds_one_class() => Keep(Rules.SeveralClasses, ".cs");

    private static void Keep(Func<SourceFile, IEnumerable<string>> rule, params string[] extensions)
    {
        var broken = SourceTree.Files(extensions).SelectMany(rule).ToArray();
        Assert.True(broken.Length == 0, string.Join(Environment.NewLine, broken));
    }
}
