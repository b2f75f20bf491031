using Halfvoice.Rig.Runs;

namespace Halfvoice.Tests.Runs;

public class CoordinatorProgressTests
{
    [Fact]
    public void A_line_of_a_cycle_is_read()
    {
        var news = CoordinatorProgress.Read(
            """{"event":"cycle","cycle":2,"settled":true,"end":"Settled","rounds":9,"seconds":1.25,"mismatch_mw":0.5,"mismatch_limit_mw":1}""");
        Assert.Equal(
            new CoordinatorProgress("cycle")
            {
                Cycle = 2,
                Settled = true,
                End = "Settled",
                Rounds = 9,
                Seconds = 1.25,
                MismatchMw = 0.5,
                MismatchLimitMw = 1,
            },
            news);
    }

    [Theory]
    [InlineData("")]
    [InlineData("warn: something")]
    [InlineData("{\"event\":\"cycle\",")]
    [InlineData("{\"event\":\"cycle\"} trailing")]
    public void Any_other_line_is_left_alone(string line) => Assert.Null(CoordinatorProgress.Read(line));

    [Fact]
    public void Values_of_another_kind_are_taken_as_missing_and_never_throw()
    {
        Assert.Equal(new CoordinatorProgress(string.Empty), CoordinatorProgress.Read("""{"event":1,"end":[],"cycle":"x","settled":3}"""));
        Assert.Equal(new CoordinatorProgress(string.Empty), CoordinatorProgress.Read("""{"event":null}"""));
    }
}
