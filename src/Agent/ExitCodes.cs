namespace Halfvoice.Agent;

/// <summary>How an agent ends.</summary>
internal static class ExitCodes
{
    /// <summary>The coordinator said farewell, or a signal asked for a stop.</summary>
    public const int Done = 0;

    /// <summary>The bundle, the state folder or the command line is wrong; standard error says how.</summary>
    public const int WrongSetup = 2;

    /// <summary>It broke; standard error and the log say how.</summary>
    public const int Broken = 3;

    /// <summary>The coordinator refused this site for good (another plan, another identity).</summary>
    public const int RefusedForGood = 4;
}
