namespace Halfvoice.Coordination;

/// <summary>What may happen to a coordinator. One door: <see cref="CoordinatorCore.Step"/>.</summary>
public abstract record CoordinatorInput
{
    private CoordinatorInput()
    {
    }

    /// <summary>The host listens; sites may join from now on.</summary>
    public sealed record Started : CoordinatorInput;

    /// <summary>A site with a proven identity has joined.</summary>
    public sealed record SiteJoined(int Site, Enrol Enrol) : CoordinatorInput;

    /// <summary>A site's stream has ended.</summary>
    public sealed record SiteLeft(int Site) : CoordinatorInput;

    public sealed record AnswerArrived(int Site, Answer Answer) : CoordinatorInput;

    public sealed record RefusalArrived(int Site, Refusal Refusal) : CoordinatorInput;

    /// <summary>The time that <see cref="CoordinatorCore.WakeAt"/> named has come.</summary>
    public sealed record Woke : CoordinatorInput;

    /// <summary>The operator or a signal asks for an orderly end.</summary>
    public sealed record StopAsked : CoordinatorInput;
}

/// <summary>What the host must do, in this order: store all of <see cref="Store"/>, then send all of <see cref="Send"/>.</summary>
public sealed class CoordinatorStep
{
    /// <summary>Journal entries; durable before anything is sent.</summary>
    public List<JournalEntry> Store { get; } = [];

    public List<(int Site, CoordinatorMessage Message)> Send { get; } = [];

    /// <summary>News for whoever watches; nothing depends on it.</summary>
    public List<CoordinatorNews> News { get; } = [];

    /// <summary>True once all cycles are done or a stop was asked for, and farewells are in <see cref="Send"/>.</summary>
    public bool Finished { get; internal set; }

    internal void Clear()
    {
        Store.Clear();
        Send.Clear();
        News.Clear();
    }
}

/// <summary>What a coordinator sends to a site.</summary>
public abstract record CoordinatorMessage
{
    private CoordinatorMessage()
    {
    }

    public sealed record Welcomed(Welcome Welcome) : CoordinatorMessage;

    public sealed record Asked(Ask Ask) : CoordinatorMessage;

    public sealed record Refused(Refusal Refusal) : CoordinatorMessage;

    public sealed record Ended(Outcome Outcome) : CoordinatorMessage;

    public sealed record Farewell(string Text) : CoordinatorMessage;
}

/// <summary>The coordinator's durable record of rounds.</summary>
public abstract record JournalEntry
{
    private JournalEntry()
    {
    }

    public sealed record SiteJoined(int Site, Enrol Enrol) : JournalEntry;

    public sealed record SiteLeft(int Site) : JournalEntry;

    /// <summary>Stored before the asks leave. The state is enough to go on from after a crash.</summary>
    public sealed record RoundAsked(RoundId Id, IReadOnlyList<(int Site, Ask Ask)> Asks, CoordinatorState State) : JournalEntry;

    /// <summary>A closed round never changes.</summary>
    public sealed record RoundClosed(
        RoundId Id, IReadOnlyList<(int Site, Answer Answer)> Answers, IReadOnlyList<int> Held, RoundMeasure Measure, double Seconds) : JournalEntry;

    public sealed record CycleClosed(
        int Cycle, CycleEnd End, int Rounds, RoundMeasure Measure, double Seconds, double UnservedMw, CoordinatorState State) : JournalEntry;

    /// <summary>Something that was refused, by us or by a site, or that came too late to matter.</summary>
    public sealed record Refused(int Site, bool BySite, Refusal Refusal) : JournalEntry;
}

/// <summary>Consensus and duals by component.</summary>
public sealed record CoordinatorState(double[] Consensus, double[] Dual);

/// <summary>News of a run for progress displays.</summary>
public abstract record CoordinatorNews
{
    private CoordinatorNews()
    {
    }

    public sealed record Gathering(int Joined, int Sites) : CoordinatorNews;

    public sealed record CycleBegan(int Cycle) : CoordinatorNews;

    public sealed record RoundDone(RoundId Id, RoundMeasure Measure, int Answered, int Asked) : CoordinatorNews;

    public sealed record CycleDone(int Cycle, CycleEnd End, int Rounds, double Seconds, RoundMeasure Measure) : CoordinatorNews;
}
