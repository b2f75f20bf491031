using Halfvoice.Grid;
using Halfvoice.Optimization;

namespace Halfvoice.Rig.Runs;

/// <summary>The central optimum for a command, or the reason in words why there is none.</summary>
public static class CentralYardstick
{
    /// <exception cref="RigException">The loads cannot be served (exit code 2), or the solver gave up (exit code 3).</exception>
    public static Optimum Solve(Network network, double[] loadMw, string when)
    {
        var optimum = CentralOptimum.Solve(network, loadMw);
        return optimum.Status switch
        {
            OptimumStatus.Optimal => optimum,
            OptimumStatus.Infeasible => throw new RigException(ExitCodes.PlanWrong,
                $"The loads of {when} cannot be served by this grid. {optimum.Infeasibility?.Describe(network)}"),
            _ => throw new RigException(ExitCodes.Broke, $"The central optimum of {when} was not found after {optimum.Iterations} iterations."),
        };
    }
}
