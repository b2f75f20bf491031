namespace Halfvoice.Tests.Rehearsals;

/// <summary>
/// Tests that start many processes, or that take the console for themselves, run one after the other and after all others:
/// the machine and the console are theirs alone.
/// </summary>
[CollectionDefinition(Name, DisableParallelization = true)]
public sealed class RealProcesses
{
    public const string Name = "real processes";
}
