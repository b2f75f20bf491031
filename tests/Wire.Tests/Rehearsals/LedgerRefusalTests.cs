using System.Security.Cryptography;

namespace Halfvoice.Tests.Rehearsals;

/// <summary>An agent that cannot be sure of its ledger answers nothing and says why.</summary>
[Collection(RealProcesses.Name)]
public sealed class LedgerRefusalTests
{
    private const int WrongSetup = 2;

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Fact]
    public async Task Two_agents_on_one_ledger_and_a_ledger_of_another_site_are_refused()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        await lab.StartCoordinatorAsync();
        var first = lab.StartAgent("mid");
        await first.WaitForAsync(line => line.Contains("NOT veiled", StringComparison.Ordinal), Cancel);
        await lab.JoinedAsync("mid", 1);

        await AssertRefusedAsync(lab.StartAgent("mid"), "Another agent has this ledger open");
        Assert.False(first.Exited.IsCompleted);

        first.Kill();
        await first.EndAsync(Cancel);
        await AssertRefusedAsync(lab.StartAgent("high", state: lab.SiteState("mid")), "another site");
    }

    [Theory]
    [InlineData("garbage")]
    [InlineData("text")]
    [InlineData("damaged pages")]
    [InlineData("cut short")]
    [InlineData("another database")]
    [InlineData("a folder")]
    public async Task A_damaged_ledger_is_refused(string damage)
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Demo) with { Cycles = 3 });
        var coordinator = await lab.StartCoordinatorAsync();
        var agents = lab.StartAgents();
        Assert.Equal(0, await coordinator.EndAsync(Cancel));
        foreach (var agent in agents.Values)
            Assert.Equal(0, await agent.EndAsync(Cancel));

        Damage(lab.LedgerOf("mill"), damage);
        await AssertRefusedAsync(lab.StartAgent("mill"), "ledger");
    }

    [Fact]
    public async Task A_state_folder_that_is_a_file_and_a_bundle_that_is_not_whole_are_told_without_a_stack_trace()
    {
        await using var lab = await Lab.CreateAsync(Checkout.Load(Checkout.Sample));
        var file = Path.Combine(lab.NewFolder("other"), "file");
        await File.WriteAllTextAsync(file, "x", Cancel);
        await AssertRefusedAsync(lab.StartAgent("mid", state: file), "state folder");
        await AssertRefusedAsync(lab.StartAgent("mid", state: Path.Combine(file, "below")), "state folder");
        await AssertRefusedAsync(lab.StartAgent("mid", bundle: lab.NewFolder("empty")), "site.json");
        await AssertRefusedAsync(lab.StartAgent("mid", bundle: file), "site.json");

        (string Part, string Words)[] parts =
        [
            ("site.json", "site.json"), ("loads.csv", "loads"), ("identity.key", "identity"), ("identity.pem", "identity"), ("authority.pem", "authority"),
        ];
        foreach (var (part, words) in parts)
        {
            var bundle = lab.NewFolder("damaged-" + part);
            foreach (var path in Directory.GetFiles(lab.SiteBundle("mid")))
                File.Copy(path, Path.Combine(bundle, Path.GetFileName(path)));
            await File.WriteAllTextAsync(Path.Combine(bundle, part), "this is none", Cancel);
            await AssertRefusedAsync(lab.StartAgent("mid", bundle: bundle, state: lab.NewFolder("state-" + part)), words);
        }
    }

    private static void Damage(string ledger, string damage)
    {
        var bytes = File.ReadAllBytes(ledger);
        switch (damage)
        {
            case "garbage":
                File.WriteAllBytes(ledger, RandomNumberGenerator.GetBytes(20_000));
                break;
            case "text":
                File.WriteAllText(ledger, "this is no ledger\n");
                break;
            case "damaged pages":
                // The first page with the list of tables stays; what follows is overwritten.
                bytes.AsSpan(4096).Fill(0xA5);
                File.WriteAllBytes(ledger, bytes);
                break;
            case "cut short":
                File.WriteAllBytes(ledger, bytes[..6000]);
                break;
            case "another database":
                File.Delete(ledger);
                _ = RunFiles.Columns(NewDatabase(ledger));
                break;
            default:
                File.Delete(ledger);
                Directory.CreateDirectory(ledger);
                break;
        }
    }

    private static string NewDatabase(string path)
    {
        using var connection = new Microsoft.Data.Sqlite.SqliteConnection($"Data Source={path};Pooling=False");
        connection.Open();
        using var command = connection.CreateCommand();
        command.CommandText = "CREATE TABLE charges (something TEXT); INSERT INTO charges VALUES ('else')";
        command.ExecuteNonQuery();
        return path;
    }

    private static async Task AssertRefusedAsync(LineProcess agent, string words)
    {
        var code = await agent.EndAsync(Cancel);
        Assert.True(code == WrongSetup, $"exit code {code}: {agent.Errors}");
        Assert.Contains(words, agent.Errors, StringComparison.OrdinalIgnoreCase);
        Assert.DoesNotContain("   at ", agent.Output + agent.Errors, StringComparison.Ordinal);
    }
}
