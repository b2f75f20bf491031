namespace Halfvoice.Coordinator;

/// <summary>How the coordinator ends.</summary>
internal static class ExitCodes
{
    /// <summary>All cycles done, or stopped in good order.</summary>
    public const int Done = 0;

    /// <summary>The bundle, the state folder or the command line is wrong; standard error says how.</summary>
    public const int WrongSetup = 2;

    /// <summary>It broke; standard error and the log say how.</summary>
    public const int Broken = 3;
}
