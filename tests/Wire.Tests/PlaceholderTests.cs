namespace Halfvoice.Tests;

public class PlaceholderTests
{
    [Fact]
    public void Builds() => Assert.True(true);
}
