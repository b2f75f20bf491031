namespace Halfvoice.Optimization;

/// <summary>A primal-dual point of a scaled program: items v with their slacks and bound multipliers, angles and prices.</summary>
internal sealed class Iterate
{
    public Iterate(ScaledProgram program)
    {
        Value = new double[program.Count];
        BelowSlack = new double[program.Count];
        AboveSlack = new double[program.Count];
        BelowDual = new double[program.Count];
        AboveDual = new double[program.Count];
        Angle = new double[program.Graph.BusCount];
        Price = new double[program.Graph.BusCount];
    }

    /// <summary>v, by item.</summary>
    public double[] Value { get; }

    /// <summary>v − lower, kept on its own because the difference loses digits next to the bound.</summary>
    public double[] BelowSlack { get; }

    /// <summary>upper − v.</summary>
    public double[] AboveSlack { get; }

    /// <summary>Multiplier of v ≥ lower, at least 0.</summary>
    public double[] BelowDual { get; }

    /// <summary>Multiplier of v ≤ upper, at least 0; of either sign for a line held at zero.</summary>
    public double[] AboveDual { get; }

    /// <summary>θ by bus.</summary>
    public double[] Angle { get; }

    /// <summary>λ by bus: what one more unit of demand costs.</summary>
    public double[] Price { get; }

    public void CopyTo(Iterate other)
    {
        Value.CopyTo(other.Value, 0);
        BelowSlack.CopyTo(other.BelowSlack, 0);
        AboveSlack.CopyTo(other.AboveSlack, 0);
        BelowDual.CopyTo(other.BelowDual, 0);
        AboveDual.CopyTo(other.AboveDual, 0);
        Angle.CopyTo(other.Angle, 0);
        Price.CopyTo(other.Price, 0);
    }
}
