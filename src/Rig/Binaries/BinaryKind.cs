namespace Halfvoice.Rig.Binaries;

/// <summary>How an executable runs.</summary>
public enum BinaryKind
{
    /// <summary>Compiled ahead of time: starts in a moment and needs no runtime.</summary>
    Native,

    /// <summary>Compiled as it runs, by an installed .NET runtime; tiered compilation is off, so that speed does not drift.</summary>
    Jit,
}
