using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

/// <summary>Compares two plans member by member, exactly.</summary>
internal static class PlanEquality
{
    public static void AssertEqual(Plan expected, Plan actual)
    {
        Assert.Equal(expected.Name, actual.Name);
        Assert.Equal(expected.Interval, actual.Interval);
        Assert.Equal(expected.Cycles, actual.Cycles);
        Assert.Equal(expected.Scheme, actual.Scheme);
        Assert.Equal(expected.Stop, actual.Stop);
        Assert.Equal(expected.Privacy, actual.Privacy);
        Assert.Equal(expected.Rounds, actual.Rounds);
        Assert.Equal(expected.Accept, actual.Accept);
        Assert.Equal(expected.Links.Default, actual.Links.Default);
        Assert.Equal(expected.Links.Sites.OrderBy(pair => pair.Key), actual.Links.Sites.OrderBy(pair => pair.Key));
        Assert.Equal(expected.Network.BaseMva, actual.Network.BaseMva);
        Assert.Equal(expected.Network.Buses, actual.Network.Buses);
        Assert.Equal(expected.Network.Lines, actual.Network.Lines);
        Assert.Equal(expected.Network.Generators, actual.Network.Generators);
        Assert.Equal(expected.Loads.Keys.Order(), actual.Loads.Keys.Order());
        foreach (var (site, series) in expected.Loads)
        {
            Assert.Equal(series.Times, actual.Loads[site].Times);
            Assert.Equal(series.Count, actual.Loads[site].Count);
            for (var snapshot = 1; snapshot <= series.Count; snapshot++)
                Assert.Equal(series.At(snapshot), actual.Loads[site].At(snapshot));
        }
    }
}
