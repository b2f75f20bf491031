using System.Security.Cryptography;
using System.Security.Cryptography.X509Certificates;
using Halfvoice.Hosting;
using Halfvoice.Rig.Authority;
using Microsoft.Extensions.Time.Testing;

namespace Halfvoice.Tests.Infrastructure;

public sealed class PeerValidatorTests : IDisposable
{
    private readonly FakeTimeProvider _clock = new(new DateTimeOffset(2031, 5, 6, 7, 8, 9, TimeSpan.Zero));
    private readonly LabAuthority _authority;
    private readonly IssuedIdentity _site;
    private readonly HandmadeAuthority _handmade = new();
    private readonly ECDsa _key = ECDsa.Create(ECCurve.NamedCurves.nistP256);

    public PeerValidatorTests()
    {
        _authority = LabAuthority.Create(TimeSpan.FromDays(365), _clock);
        _site = _authority.Issue(new IdentityRequest(IdentityRole.Site, "port"));
    }

    [Fact]
    public void No_certificate_is_refused()
    {
        Assert.Equal(PeerRefusal.NoCertificate, Validator().CheckClient(null, PeerRole.Site).Refusal);
    }

    [Fact]
    public void A_certificate_of_another_run_is_refused()
    {
        using var other = LabAuthority.Create(TimeSpan.FromDays(365), _clock);
        using var site = other.Issue(new IdentityRequest(IdentityRole.Site, "port"));

        Assert.Equal(PeerRefusal.UnknownAuthority, Check(site.Certificate));
    }

    [Fact]
    public void A_certificate_of_a_namesake_of_the_authority_is_refused()
    {
        using var namesake = new HandmadeAuthority(_authority.Certificate.Subject);
        using var site = namesake.Sign(_key, HandmadeAuthority.Uris("urn:halfvoice:site:port"));

        Assert.Equal(_authority.Certificate.SubjectName.RawData, site.IssuerName.RawData);
        Assert.Equal(PeerRefusal.UnknownAuthority, Check(site));
    }

    [Fact]
    public void A_certificate_that_a_site_signed_with_its_own_is_refused()
    {
        var request = new CertificateRequest("CN=any", _key, HashAlgorithmName.SHA256);
        request.CertificateExtensions.Add(HandmadeAuthority.Uris("urn:halfvoice:coordinator"));
        using var siteKey = _site.Certificate.GetECDsaPrivateKey()!;
        var signer = X509SignatureGenerator.CreateForECDsa(siteKey);
        var now = _clock.GetUtcNow();
        using var forged = request.Create(_site.Certificate.SubjectName, signer, now.AddHours(-1), now.AddHours(1), [1, 2, 3]);

        Assert.Equal(PeerRefusal.UnknownAuthority, Check(forged));
    }

    [Fact]
    public void The_authoritys_own_certificate_is_no_peers()
    {
        Assert.Equal(PeerRefusal.UnknownAuthority, Check(_authority.Certificate));
    }

    [Fact]
    public void A_certificate_with_any_changed_bit_is_refused_or_unreadable()
    {
        var bytes = _site.Certificate.RawData;
        var accepted = 0;
        for (var position = 0; position < bytes.Length; position++)
        {
            var changed = (byte[])bytes.Clone();
            changed[position] ^= 0x01;
            try
            {
                using var certificate = X509CertificateLoader.LoadCertificate(changed);
                if (Validator().CheckClient(certificate, PeerRole.Site).IsAccepted)
                    accepted++;
            }
            catch (CryptographicException)
            {
                // It is no certificate any more, and no TLS stack would hand it to us.
            }
        }

        Assert.Equal(0, accepted);
    }

    [Fact]
    public void A_certificate_counts_from_its_first_to_its_last_second()
    {
        var now = _clock.GetUtcNow();
        using var brief = _authority.Issue(new IdentityRequest(IdentityRole.Site, "port")
        {
            ValidFrom = now + TimeSpan.FromMinutes(1),
            ValidUntil = now + TimeSpan.FromMinutes(2),
        });

        Assert.Equal(PeerRefusal.NotYetValid, Check(brief.Certificate));
        _clock.Advance(TimeSpan.FromSeconds(60));
        Assert.Null(Check(brief.Certificate));
        _clock.Advance(TimeSpan.FromSeconds(60));
        Assert.Null(Check(brief.Certificate));
        _clock.Advance(TimeSpan.FromSeconds(1));
        Assert.Equal(PeerRefusal.Expired, Check(brief.Certificate));
    }

    [Fact]
    public void Certificates_for_rehearsing_expiry_can_lie_wholly_outside_the_authoritys_own_validity()
    {
        var now = _clock.GetUtcNow();
        using var old = _authority.Issue(
            new IdentityRequest(IdentityRole.Site, "port") { ValidFrom = now.AddYears(-2), ValidUntil = now.AddYears(-1) });
        using var early = _authority.Issue(
            new IdentityRequest(IdentityRole.Site, "port") { ValidFrom = now.AddYears(2), ValidUntil = now.AddYears(3) });

        Assert.Equal(PeerRefusal.Expired, Check(old.Certificate));
        Assert.Equal(PeerRefusal.NotYetValid, Check(early.Certificate));
    }

    [Fact]
    public void Nothing_counts_once_the_authority_has_expired()
    {
        using var longer = _authority.Issue(
            new IdentityRequest(IdentityRole.Site, "port") { ValidUntil = _clock.GetUtcNow().AddYears(5) });
        var validator = Validator();
        _clock.Advance(TimeSpan.FromDays(366));

        Assert.Equal(PeerRefusal.Expired, validator.CheckClient(longer.Certificate, PeerRole.Site).Refusal);
    }

    [Fact]
    public void A_revoked_certificate_is_refused_and_its_successor_is_not()
    {
        using var successor = _authority.Issue(new IdentityRequest(IdentityRole.Site, "port"));
        _authority.Revoke(_site.SerialNumber);
        _authority.Revoke(_site.SerialNumber.ToLowerInvariant());

        Assert.Equal(PeerRefusal.Revoked, Check(_site.Certificate));
        Assert.Null(Check(successor.Certificate));
        Assert.Equal(1, RevocationList.Read(_authority.RevocationList(), _authority.Certificate).Count);
    }

    [Fact]
    public void Without_a_list_that_holds_nobody_is_accepted()
    {
        var validator = new PeerValidator(_authority.Certificate, () => RevocationList.Unreadable("the file is missing"), _clock);

        var verdict = validator.CheckClient(_site.Certificate, PeerRole.Site);

        Assert.Equal(PeerRefusal.RevocationListInvalid, verdict.Refusal);
        Assert.Contains("the file is missing", verdict.Explanation);
    }

    [Fact]
    public void A_list_of_the_future_or_past_its_own_end_does_not_hold()
    {
        using var site = _handmade.Sign(_key, HandmadeAuthority.Uris("urn:halfvoice:site:port"));
        var now = _clock.GetUtcNow();
        const string listNumber = "2.5.29.20";
        byte[][] lists =
        [
            _handmade.List(now.AddHours(-1), now.AddHours(1), listNumber, false),
            _handmade.List(now.AddHours(-1), null, listNumber, false),
            _handmade.List(now.AddHours(1), now.AddHours(2), listNumber, false),
            _handmade.List(now.AddHours(-2), now.AddHours(-1), listNumber, false),
        ];

        var refusals = lists.Select(list => HandmadeValidator(list).CheckClient(site, PeerRole.Site).Refusal);

        Assert.Equal([null, null, PeerRefusal.RevocationListInvalid, PeerRefusal.RevocationListInvalid], refusals);
    }

    [Fact]
    public void A_servers_certificate_is_none_for_a_client_and_the_other_way_round()
    {
        using var coordinator = _authority.Issue(new IdentityRequest(IdentityRole.Coordinator));

        Assert.Equal(PeerRefusal.WrongUse, Validator().CheckClient(coordinator.Certificate, PeerRole.Coordinator).Refusal);
        Assert.Equal(PeerRefusal.WrongUse, Validator().CheckServer(_site.Certificate).Refusal);
    }

    [Fact]
    public void A_role_that_has_no_business_here_is_refused()
    {
        Assert.Equal(PeerRefusal.WrongRole, Validator().CheckClient(_site.Certificate, PeerRole.Operator, PeerRole.Rig).Refusal);
        Assert.Equal(PeerRefusal.WrongRole, Validator().CheckClient(_site.Certificate).Refusal);
    }

    [Fact]
    public void A_certificate_must_name_exactly_one_identity_in_its_one_spelling()
    {
        var now = _clock.GetUtcNow();
        var validator = HandmadeValidator(_handmade.List(now.AddHours(-1), null, "2.5.29.20", false));
        X509Extension[][] nameless =
        [
            [],
            [HandmadeAuthority.Uris("https://example.org/")],
            [HandmadeAuthority.Uris("urn:halfvoice:site:")],
            [HandmadeAuthority.Uris("urn:halfvoice:sites:port")],
            [HandmadeAuthority.Uris("urn:halfvoice:operator:port")],
            [HandmadeAuthority.Uris("urn:halfvoice:site:port", "urn:halfvoice:site:hospital")],
            [HandmadeAuthority.Uris("urn:halfvoice:site:port", "https://example.org/")],
            [HandmadeAuthority.Uris("urn:halfvoice:site:a%2fb")],
        ];

        foreach (var extensions in nameless)
        {
            using var certificate = _handmade.Sign(_key, extensions);
            Assert.Equal(PeerRefusal.NoIdentity, validator.CheckClient(certificate, PeerRole.Site, PeerRole.Operator).Refusal);
        }

        using var named = _handmade.Sign(_key, HandmadeAuthority.Uris("urn:halfvoice:site:port"));
        Assert.Equal("port", validator.CheckClient(named, PeerRole.Site).Identity?.Site);
    }

    [Fact]
    public void A_certificate_with_damaged_names_is_refused()
    {
        var validator = HandmadeValidator(_handmade.List(_clock.GetUtcNow().AddHours(-1), null, "2.5.29.20", false));
        using var cut = _handmade.Sign(_key, new X509Extension("2.5.29.17", [0x30, 0x03, 0x86, 0x09, 0x41], false));
        using var notAscii = _handmade.Sign(_key, new X509Extension("2.5.29.17", [0x30, 0x03, 0x86, 0x01, 0xFF], false));

        Assert.All([cut, notAscii], certificate => Assert.False(validator.CheckClient(certificate, PeerRole.Site).IsAccepted));
    }

    [Fact]
    public void Every_refusal_says_what_was_wrong()
    {
        _authority.Revoke(_site.SerialNumber);

        var verdict = Validator().CheckClient(_site.Certificate, PeerRole.Site);

        Assert.Contains(_site.SerialNumber, verdict.Explanation);
        Assert.Null(verdict.Identity);
        Assert.False(verdict.IsAccepted);
    }

    public void Dispose()
    {
        _site.Dispose();
        _authority.Dispose();
        _handmade.Dispose();
        _key.Dispose();
    }

    private PeerRefusal? Check(X509Certificate2 presented) => Validator().CheckClient(presented, PeerRole.Site).Refusal;

    private PeerValidator Validator()
    {
        var list = RevocationList.Read(_authority.RevocationList(), _authority.Certificate);
        Assert.Null(list.Fault);
        return new PeerValidator(_authority.Certificate, () => list, _clock);
    }

    private PeerValidator HandmadeValidator(byte[] bytes)
    {
        var list = RevocationList.Read(bytes, _handmade.Certificate);
        Assert.Null(list.Fault);
        return new PeerValidator(_handmade.Certificate, () => list, _clock);
    }
}
