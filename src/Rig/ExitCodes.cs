namespace Halfvoice.Rig;

/// <summary>How the rig ends; the same for every command.</summary>
public static class ExitCodes
{
    /// <summary>Done; for a rehearsal: every limit passed.</summary>
    public const int Passed = 0;

    /// <summary>A limit failed.</summary>
    public const int LimitFailed = 1;

    /// <summary>The plan or the command line is wrong; everything that is wrong was printed.</summary>
    public const int PlanWrong = 2;

    /// <summary>The rehearsal itself broke, so that it says nothing about the plan.</summary>
    public const int Broke = 3;
}
