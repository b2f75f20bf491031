namespace Halfvoice.Plans;

/// <summary>Place names put together from syllables; unique within one plan and safe as file names.</summary>
internal sealed class InventedNames(SeededNumbers numbers)
{
    private static readonly string[] Starts =
    [
        "al", "bar", "bren", "cal", "cor", "dun", "el", "fen", "gar", "hal", "ister", "jor", "kel", "lar", "mar", "nor",
        "or", "pel", "quen", "ros", "sal", "tor", "ul", "ver", "wen", "yar", "ash", "birk", "crom", "drey", "ost", "thorn",
    ];

    private static readonly string[] Middles = ["", "a", "e", "i", "o", "en", "er", "in", "an", "ing", "is", "el", "am", "or"];

    private static readonly string[] Ends =
    [
        "by", "dale", "ey", "field", "ford", "gate", "holm", "ley", "mere", "moor", "ness", "pool", "rigg", "stead",
        "stow", "thwaite", "ton", "wade", "wick", "worth", "combe", "fell", "haven", "marsh", "brook", "beck",
    ];

    private static readonly string[] Regions = ["Vale", "Reach", "Shore", "Plain", "Basin", "Coast", "Marches", "Uplands"];

    private readonly HashSet<string> _taken = new(StringComparer.Ordinal);

    /// <summary>A lower-case name not given before. There are about 11,000 without a second word and many more with one.</summary>
    public string Place()
    {
        const int singleWordTries = 12;
        for (var attempt = 0; ; attempt++)
        {
            var name = Word();
            if (attempt >= singleWordTries)
                name += "-" + Word();
            if (_taken.Add(name))
                return name;
        }
    }

    /// <summary>A name for the whole region, in title case.</summary>
    public string Region()
    {
        var word = Word();
        return char.ToUpperInvariant(word[0]) + word[1..] + " " + numbers.Pick(Regions);
    }

    private string Word() => numbers.Pick(Starts) + numbers.Pick(Middles) + numbers.Pick(Ends);
}
