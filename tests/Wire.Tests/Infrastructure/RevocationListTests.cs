using System.Text;
using Halfvoice.Hosting;
using Halfvoice.Rig.Authority;
using Microsoft.Extensions.Time.Testing;

namespace Halfvoice.Tests.Infrastructure;

public sealed class RevocationListTests : IDisposable
{
    private const string ListNumber = "2.5.29.20";
    private const string PartialList = "2.5.29.27";

    private readonly FakeTimeProvider _clock = new(new DateTimeOffset(2031, 5, 6, 7, 8, 9, TimeSpan.Zero));
    private readonly LabAuthority _authority;
    private readonly HandmadeAuthority _handmade = new();
    private readonly TestFolder _folder = new();

    public RevocationListTests() => _authority = LabAuthority.Create(TimeSpan.FromDays(365), _clock);

    private static CancellationToken Cancel => TestContext.Current.CancellationToken;

    [Fact]
    public void Exactly_the_revoked_serial_numbers_are_on_the_list()
    {
        var identities = Enumerable.Range(0, 40)
            .Select(number => _authority.Issue(new IdentityRequest(IdentityRole.Site, $"{number}"))).ToList();
        foreach (var identity in identities.Where((_, index) => index % 3 == 0))
            _authority.Revoke(identity.SerialNumber);

        var list = RevocationList.Read(_authority.RevocationList(), _authority.Certificate);

        Assert.Null(list.Fault);
        Assert.Equal(
            identities.Select((_, index) => index % 3 == 0),
            identities.Select(identity => list.Contains(identity.Certificate.SerialNumberBytes.Span)));
        Assert.Equal(14, list.Count);
        Assert.Equal(_clock.GetUtcNow() - LabAuthority.Backdating, list.ThisUpdate);
    }

    [Fact]
    public void A_serial_number_with_its_top_bit_set_or_leading_zeros_is_found()
    {
        var now = _clock.GetUtcNow();
        var list = RevocationList.Read(_handmade.List(now, null, ListNumber, false, [0xFF, 1], [7]), _handmade.Certificate);

        Assert.True(list.Contains([0xFF, 1]));
        Assert.True(list.Contains([0, 0xFF, 1]));
        Assert.True(list.Contains([0, 0, 7]));
        Assert.False(list.Contains([1]));
    }

    [Fact]
    public void A_list_of_another_authority_does_not_hold()
    {
        using var other = LabAuthority.Create(TimeSpan.FromDays(1), _clock);

        Assert.Contains("did not sign", RevocationList.Read(other.RevocationList(), _authority.Certificate).Fault);
    }

    [Fact]
    public void A_list_with_any_changed_bit_or_a_missing_end_does_not_hold()
    {
        _authority.Revoke("0102030405060708");
        var bytes = _authority.RevocationList();

        for (var position = 0; position < bytes.Length; position++)
        {
            var changed = (byte[])bytes.Clone();
            changed[position] ^= 0x10;
            Assert.NotNull(RevocationList.Read(changed, _authority.Certificate).Fault);
            Assert.NotNull(RevocationList.Read(bytes.AsSpan(0, position), _authority.Certificate).Fault);
        }

        Assert.NotNull(RevocationList.Read([.. bytes, 0], _authority.Certificate).Fault);
        Assert.Null(RevocationList.Read(bytes, _authority.Certificate).Fault);
    }

    [Theory]
    [InlineData("")]
    [InlineData("no list at all")]
    [InlineData("-----BEGIN X509 CRL-----")]
    [InlineData("-----BEGIN X509 CRL-----\nAAAA\n-----END X509 CRL-----")]
    [InlineData("-----BEGIN CERTIFICATE-----\nAAAA\n-----END CERTIFICATE-----")]
    public void Something_else_does_not_hold(string content)
    {
        Assert.NotNull(RevocationList.Read(Encoding.UTF8.GetBytes(content), _authority.Certificate).Fault);
    }

    [Fact]
    public void A_list_larger_than_the_limit_is_not_even_looked_into()
    {
        Assert.Contains("limit", RevocationList.Read(new byte[RevocationList.LargestBytes + 1], _authority.Certificate).Fault);
    }

    [Fact]
    public void A_partial_list_is_refused_because_it_leaves_out_revocations()
    {
        var now = _clock.GetUtcNow();

        Assert.Contains(PartialList, RevocationList.Read(_handmade.List(now, null, PartialList, true), _handmade.Certificate).Fault);
        Assert.Null(RevocationList.Read(_handmade.List(now, null, "1.2.3.4", false), _handmade.Certificate).Fault);
    }

    [Fact]
    public async Task A_list_made_by_OpenSsl_is_read()
    {
        OpenSsl.SkipIfAbsent();
        await File.WriteAllTextAsync(_folder.File("authority.pem"), _handmade.Certificate.ExportCertificatePem(), Cancel);
        await File.WriteAllTextAsync(_folder.File("authority.key"), _handmade.Key.ExportPkcs8PrivateKeyPem(), Cancel);
        await File.WriteAllTextAsync(
            _folder.File("index"), "R\t310101000000Z\t300101000000Z,keyCompromise\t0A1B2C\tunknown\t/CN=a site\n", Cancel);
        await File.WriteAllTextAsync(_folder.File("number"), "01\n", Cancel);
        await File.WriteAllTextAsync(
            _folder.File("ca.cnf"),
            "[ca]\ndefault_ca=d\n[d]\ndatabase=index\ncrlnumber=number\ndefault_md=sha256\ndefault_crl_days=9\n",
            Cancel);

        var (exitCode, output) = await OpenSsl.RunAsync(
            _folder.Path, Cancel,
            "ca", "-config", "ca.cnf", "-gencrl", "-cert", "authority.pem", "-keyfile", "authority.key", "-out", "list.crl");
        Assert.True(exitCode == 0, output);
        var list = RevocationList.Read(await File.ReadAllBytesAsync(_folder.File("list.crl"), Cancel), _handmade.Certificate);

        Assert.Null(list.Fault);
        Assert.True(list.Contains([0x0A, 0x1B, 0x2C]));
        Assert.Equal(1, list.Count);
        Assert.Equal(TimeSpan.FromDays(9), list.NextUpdate - list.ThisUpdate);
    }

    [Fact]
    public void A_changed_file_counts_at_once_and_a_missing_or_damaged_one_counts_as_no_list()
    {
        using var site = _authority.Issue(new IdentityRequest(IdentityRole.Site, "port"));
        var path = _folder.File("revoked.crl");
        var file = new RevocationListFile(path, _authority.Certificate);
        Assert.Contains("missing", file.Current.Fault);

        _authority.WriteRevocationList(path);
        Assert.Equal((null, 0), (file.Current.Fault, file.Current.Count));
        Assert.Same(file.Current, file.Current);

        _authority.Revoke(site.SerialNumber);
        _authority.WriteRevocationList(path);
        Assert.True(file.Current.Contains(site.Certificate.SerialNumberBytes.Span));

        File.WriteAllText(path, "damaged");
        Assert.NotNull(file.Current.Fault);
        File.Delete(path);
        Assert.Contains("missing", file.Current.Fault);
    }

    public void Dispose()
    {
        _authority.Dispose();
        _handmade.Dispose();
        _folder.Dispose();
    }
}
