using Halfvoice.Coordination;
using Halfvoice.Wire;
using V1 = Halfvoice.Wire.V1;

namespace Halfvoice.Tests.Wire;

/// <summary>A site cannot declare noise of a size that would make the coordinator's own numbers infinite.</summary>
public class EnrolBoundsTests
{
    [Theory]
    [InlineData(0)]
    [InlineData(1e20)]
    [InlineData(WireContract.MaxNoiseScale)]
    public void A_noise_scale_within_bounds_is_read(double scale)
    {
        var (message, fault) = Read(scale);
        Assert.Null(fault);
        Assert.Equal(scale, Assert.IsType<FromSiteMessage.Enrolled>(message).Enrol.NoiseScale);
    }

    [Theory]
    [InlineData(-1e-300)]
    [InlineData(1.1e30)]
    [InlineData(double.MaxValue)]
    [InlineData(double.PositiveInfinity)]
    [InlineData(double.NaN)]
    public void A_noise_scale_beyond_them_is_refused(double scale)
    {
        var (message, fault) = Read(scale);
        Assert.Null(message);
        Assert.Equal(RefusalReason.OutOfRange, fault!.Reason);
    }

    private static (FromSiteMessage? Message, WireFault? Fault) Read(double scale)
    {
        var sent = new CoordinatorWire().WriteEnrol("north", new Enrol("digest", -30, scale, 1, RoundId.None));
        return new SiteWire().Read(V1.FromSite.Parser.ParseFrom(Google.Protobuf.MessageExtensions.ToByteArray(sent)));
    }
}
