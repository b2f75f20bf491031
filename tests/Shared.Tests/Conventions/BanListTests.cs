using System.Diagnostics;
using System.Text.RegularExpressions;

namespace Halfvoice.Tests.Conventions;

/// <summary>
/// src/Shared has no I/O, no clock and no randomness of its own because its build refuses them. Here that build is given a
/// file that uses everything on the list, line by line, and must refuse each line for that reason and no other.
/// </summary>
public class BanListTests
{
    private static readonly TimeSpan BuildWithin = TimeSpan.FromMinutes(3);

    [Fact]
    public void Every_banned_symbol_exists()
    {
        var none = Symbols().Where(symbol => symbol.Resolve() is null).Select(symbol => $"{symbol.Kind}:{symbol.Name}");
        Assert.Empty(none);
    }

    [Fact]
    public void Every_banned_symbol_has_a_reason_and_stands_once()
    {
        Assert.All(Symbols(), symbol => Assert.False(string.IsNullOrWhiteSpace(symbol.Reason), symbol.Name));
        Assert.Equal(Symbols().Length, Symbols().Select(symbol => symbol.Name).Distinct().Count());
    }

    [Theory]
    [InlineData("T:System.IO.Fille;x")]
    [InlineData("P:System.DateTime.UtcNever;x")]
    [InlineData("M:System.Threading.Tasks.Task.Run(System.String);x")]
    [InlineData("M:System.Guid.NewGuid(System.Int32);x")]
    public void A_mistyped_symbol_is_found(string line) => Assert.Null(BannedSymbol.Parse(line).Resolve());

    [Theory]
    [InlineData("T:System.IO.File")]
    [InlineData("T:System.Random")]
    [InlineData("T:System.Environment")]
    [InlineData("T:System.Diagnostics.Stopwatch")]
    [InlineData("P:System.DateTime.UtcNow")]
    [InlineData("P:System.DateTimeOffset.UtcNow")]
    [InlineData("P:System.TimeProvider.System")]
    [InlineData("T:System.Security.Cryptography.RandomNumberGenerator")]
    [InlineData("M:System.Guid.NewGuid")]
    public void The_list_bans(string id) => Assert.Contains(Symbols(), symbol => $"{symbol.Kind}:{symbol.Name}" == id);

    [Fact]
    public async Task The_build_of_Shared_refuses_every_symbol_of_the_list_and_nothing_else()
    {
        var project = Repository.PathOf("src", "Shared");
        Assert.SkipUnless(File.Exists(Path.Combine(project, "obj", "project.assets.json")), "src/Shared was not restored here.");
        var folder = Directory.CreateTempSubdirectory("halfvoice-bans-");
        try
        {
            var symbols = Symbols();
            var snippet = Path.Combine(folder.FullName, "Uses.cs");
            string[] head = ["internal static class Uses {", "static void Take(object? x) => x?.ToString();", "static void All() {", "Take(1);"];
            await File.WriteAllLinesAsync(snippet, [.. head, .. symbols.Select(symbol => symbol.Use()), "}", "}"], TestContext.Current.CancellationToken);
            var output = await BuildAsync(project, folder.FullName, snippet);

            var errors = Regex.Matches(output, @"Uses\.cs\((?<line>\d+),\d+\): error (?<id>\w+)");
            Assert.True(errors.Count > 0, output);
            Assert.All(errors, error => Assert.Equal("RS0030", error.Groups["id"].Value));
            var refused = errors.Select(error => int.Parse(error.Groups["line"].Value)).Distinct().Order();
            Assert.Equal(Enumerable.Range(head.Length + 1, symbols.Length), refused);
        }
        finally
        {
            folder.Delete(recursive: true);
        }
    }

    private static BannedSymbol[] Symbols() =>
        [.. File.ReadAllLines(Repository.PathOf("src", "Shared", "BannedSymbols.txt")).Where(line => line.Length > 0).Select(BannedSymbol.Parse)];

    /// <summary>Compiles the one file with everything that Shared's project says, and leaves nothing in the source tree.</summary>
    private static async Task<string> BuildAsync(string project, string folder, string snippet)
    {
        var targets = Path.Combine(folder, "one-file.targets");
        await File.WriteAllTextAsync(targets, $"""
            <Project>
              <ItemGroup>
                <Compile Remove="@(Compile)" />
                <Protobuf Remove="@(Protobuf)" />
                <Compile Include="{snippet}" />
              </ItemGroup>
            </Project>
            """);
        var start = new ProcessStartInfo("dotnet")
        {
            WorkingDirectory = project,
            RedirectStandardOutput = true,
            RedirectStandardError = true,
            ArgumentList =
            {
                "build", "Shared.csproj", "-t:Compile", "--no-restore", "-nologo", "-v:q", "-nodeReuse:false", "-p:UseSharedCompilation=false",
                $"-p:CustomAfterMicrosoftCommonTargets={targets}", $"-p:IntermediateOutputPath={folder}{Path.DirectorySeparatorChar}",
            },
        };
        // The test host's own settings of the build engine would send the build to another SDK.
        foreach (var name in start.Environment.Keys.Where(name => name.StartsWith("MSBUILD", StringComparison.OrdinalIgnoreCase)).ToArray())
            start.Environment.Remove(name);
        using var build = StartOrSkip(start);
        using var bound = CancellationTokenSource.CreateLinkedTokenSource(TestContext.Current.CancellationToken);
        bound.CancelAfter(BuildWithin);
        try
        {
            var errors = build.StandardError.ReadToEndAsync(bound.Token);
            var output = await build.StandardOutput.ReadToEndAsync(bound.Token);
            await build.WaitForExitAsync(bound.Token);
            return output + await errors;
        }
        catch (OperationCanceledException)
        {
            build.Kill(entireProcessTree: true);
            throw;
        }
    }

    private static Process StartOrSkip(ProcessStartInfo start)
    {
        try
        {
            return Process.Start(start)!;
        }
        catch (System.ComponentModel.Win32Exception)
        {
            Assert.Skip("The .NET SDK is not at hand: there is no 'dotnet' on the path.");
            throw;
        }
    }
}
