namespace Halfvoice.Tests.Conventions;

/// <summary>Every rule finds what it is for, where it is, and leaves what only looks like it.</summary>
public class RuleTests
{
    [Fact]
    public void A_function_of_71_lines_is_found_and_one_of_70_is_not()
    {
        Assert.Empty(Rules.LongFunctions(Source(Method(70))));
        var found = Assert.Single(Rules.LongFunctions(Source(Method(71))));
        Assert.StartsWith("src/A.cs:4: void Long() takes 71 lines", found, StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("int X => Y switch\n{\n@\n};")]
    [InlineData("int X\n{\n  get { return 1; }\n@\n}")]
    [InlineData("T X<T>(int a = 3)\n  where T : class, new()\n{\n@\n}")]
    [InlineData("A(int x) : base(x)\n{\n@\n}")]
    [InlineData("bool operator ==(A x, A y)\n{\n@\n}")]
    [InlineData("void X() => Run(() =>\n{\n@\n});")]
    [InlineData("class Inner { void X()\n{\n@\n} }")]
    public void Every_form_of_function_is_measured(string form)
    {
        var text = "class A\n{\n" + form.Replace("@", Filler(70), StringComparison.Ordinal) + "\n}\n";
        Assert.Single(Rules.LongFunctions(Source(text)));
    }

    [Theory]
    [InlineData("int[] X =\n[\n@\n];")]
    [InlineData("Dictionary<int, int> X { get; } = new()\n{\n@\n};")]
    public void A_long_table_is_no_long_function(string form)
    {
        var rows = string.Join('\n', Enumerable.Repeat("1,", 100));
        Assert.Empty(Rules.LongFunctions(Source("class A\n{\n" + form.Replace("@", rows, StringComparison.Ordinal) + "\n}\n")));
    }

    [Theory]
    [InlineData("var s = \"}\";")]
    [InlineData("var s = $\"{(a ? \"}\" : \"{\")} }} {{\";")]
    [InlineData("var s = @\"\"\"}\";")]
    [InlineData("var s = \"\"\"\n } \"\" }\n\"\"\";")]
    [InlineData("var s = '}'; var t = '\\''; var u = '\"';")]
    [InlineData("// } \"\n")]
    [InlineData("/* } \n } */")]
    [InlineData("#pragma warning disable X // }\n")]
    public void Braces_in_literals_and_comments_do_not_end_a_function(string trap)
    {
        var text = "class A\n{\nvoid X()\n{\n" + trap + "\n" + Filler(70) + "\n}\n}\n";
        var member = Assert.Single(CodeOutline.Of(text).Members);
        Assert.Equal("void X()", member.Head);
        Assert.True(member.Lines > 70);
        Assert.Equal(text.Length, CodeText.Blank(text).Length);
    }

    [Fact]
    public void A_file_of_401_lines_is_found()
    {
        Assert.Empty(Rules.LongFile(Source(Filler(400) + "\n")));
        Assert.Single(Rules.LongFile(Source(Filler(401) + "\n")));
    }

    [Fact]
    public void A_line_of_161_columns_is_found()
    {
        Assert.Empty(Rules.WideLines(Source(new string('x', 160) + "\r\n")));
        Assert.StartsWith("src/A.cs:2:", Assert.Single(Rules.WideLines(Source("a\n" + new string('x', 161)))), StringComparison.Ordinal);
    }

    [Theory]
    [InlineData("throw new NotImplemented", "Exception();")]
    [InlineData("// TO", "DO: later")]
    [InlineData("// FIX", "ME")]
    public void Unfinished_work_is_found(string first, string second)
    {
        Assert.Single(Rules.UnfinishedWork(Source(first + second)));
        Assert.Empty(Rules.UnfinishedWork(Source(first + " " + second)));
    }

    [Theory]
    [InlineData("Thread.", "Sleep(1);")]
    [InlineData("await Task.", "Delay(1);")]
    public void A_sleep_is_found_in_a_test_and_allowed_in_the_product_and_in_benchmarks(string first, string second)
    {
        Assert.Single(Rules.Sleeps(new SourceFile("tests/A.cs", first + second)));
        Assert.Empty(Rules.Sleeps(Source(first + second)));
        Assert.Empty(Rules.Sleeps(new SourceFile("tests/Benchmarks/A.cs", first + second)));
    }

    [Theory]
    [InlineData("\"/ro", "ot/x\"")]
    [InlineData("\"/tm", "p/x\"")]
    [InlineData("see /wo", "rk/main")]
    [InlineData("file:///ho", "me/me/x")]
    [InlineData("@\"C:\\Us", "ers\\me\"")]
    public void A_path_of_one_machine_is_found(string first, string second) =>
        Assert.Single(Rules.MachinePaths(Source(first + second)));

    [Theory]
    [InlineData("tests/work/x")]
    [InlineData("https://host/home/")]
    [InlineData("\"/opt/halfvoice/x\"")]
    public void A_relative_path_or_one_inside_an_image_is_allowed(string text) => Assert.Empty(Rules.MachinePaths(Source(text)));

    [Theory]
    [InlineData("https://api.nuget", ".org/v3")]
    [InlineData("FROM docker", ".io/library/x")]
    public void A_registry_is_found(string first, string second)
    {
        Assert.Single(Rules.RegistryHosts(Source(first + second)));
        Assert.Empty(Rules.RegistryHosts(Source(first + second.Replace(".", "-", StringComparison.Ordinal))));
    }

    [Fact]
    public void A_second_class_is_found_and_a_family_of_records_is_not()
    {
        var family = "namespace N;\n[X(1)]\npublic sealed record A(int X);\nenum C { D }\npublic static class E { class F { } }\n";
        Assert.Empty(Rules.SeveralClasses(Source(family)));
        Assert.Single(Rules.SeveralClasses(Source(family + "internal sealed class G<T>(int x) where T : class { }")));
    }

    private static SourceFile Source(string text) => new("src/A.cs", text);

    private static string Method(int lines) => $"class A\n{{\n[X(1)]\nvoid Long()\n{{\n{Filler(lines - 3)}\n}}\n}}\n";

    private static string Filler(int lines) => string.Join('\n', Enumerable.Repeat("x();", lines));
}
