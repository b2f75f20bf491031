using Halfvoice.Privacy;

namespace Halfvoice.Tests.Privacy;

public class AnswerMemoryTests
{
    private static readonly AskDigest First = AskDigest.Of([1, 2, 3]);
    private static readonly AskDigest Second = AskDigest.Of([1, 2, 4]);

    private static RoundRefusalReason Refused(AnswerDecision decision) => Assert.IsType<RoundRefused>(decision).Reason;

    [Fact]
    public void The_same_ask_gets_the_identical_bytes()
    {
        var memory = new AnswerMemory();
        Assert.IsType<AnswerAfresh>(memory.Look(1, 1, First));
        byte[] answer = [9, 8, 7];
        memory.Keep(1, 1, First, answer);
        answer[0] = 0;
        for (var i = 0; i < 3; i++)
            Assert.Equal([9, 8, 7], Assert.IsType<AnswerRepeated>(memory.Look(1, 1, First)).Bytes.ToArray());
    }

    [Fact]
    public void The_same_round_with_another_ask_is_refused()
    {
        var memory = new AnswerMemory();
        memory.Keep(1, 1, First, [1]);
        Assert.Equal(RoundRefusalReason.AskChanged, Refused(memory.Look(1, 1, Second)));
        Assert.IsType<AnswerAfresh>(memory.Look(1, 2, Second));
        Assert.Throws<InvalidOperationException>(() => memory.Keep(1, 1, Second, [2]));
        Assert.Throws<InvalidOperationException>(() => memory.Keep(1, 1, First, [2]));
    }

    [Fact]
    public void A_forfeited_round_gets_no_answer_but_a_kept_one_is_repeated()
    {
        var memory = new AnswerMemory();
        memory.Keep(2, 3, First, [5]);
        memory.ForfeitThrough(2, 8);
        memory.ForfeitThrough(2, 1);
        Assert.Equal(RoundRefusalReason.Forfeited, Refused(memory.Look(2, 4, First)));
        Assert.Equal(RoundRefusalReason.Forfeited, Refused(memory.Look(2, 8, First)));
        Assert.Equal(RoundRefusalReason.Forfeited, Refused(memory.Look(1, 99, First)));
        Assert.IsType<AnswerRepeated>(memory.Look(2, 3, First));
        Assert.IsType<AnswerAfresh>(memory.Look(2, 9, First));
    }

    [Fact]
    public void A_round_that_was_passed_over_is_refused()
    {
        var memory = new AnswerMemory();
        memory.Keep(1, 5, First, [1]);
        Assert.Equal(RoundRefusalReason.Superseded, Refused(memory.Look(1, 4, First)));
    }

    [Fact]
    public void What_no_longer_fits_is_refused_and_never_answered_afresh()
    {
        var memory = new AnswerMemory(3);
        for (var round = 1; round <= 5; round++)
            memory.Keep(1, round, First, [(byte)round]);
        Assert.Equal(RoundRefusalReason.Superseded, Refused(memory.Look(1, 2, First)));
        Assert.IsType<AnswerRepeated>(memory.Look(1, 3, First));
        Assert.Throws<ArgumentOutOfRangeException>(() => new AnswerMemory(0));
    }

    /// <summary>The digest of "abc" is the published example of the SHA-256 standard (FIPS 180-4).</summary>
    [Fact]
    public void A_digest_survives_storage()
    {
        var digest = AskDigest.Of("abc"u8);
        Assert.Equal("BA7816BF8F01CFEA414140DE5DAE2223B00361A396177A9CB410FF61F20015AD", Convert.ToHexString(digest.ToBytes()));
        Assert.Equal(digest, AskDigest.FromBytes(digest.ToBytes()));
        Assert.Throws<ArgumentException>(() => AskDigest.FromBytes([1]));
    }
}
