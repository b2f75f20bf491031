namespace Halfvoice.Tests.Conventions;

/// <summary>A member of a type, or a statement of a program without one.</summary>
/// <param name="Head">Its text before its body, attributes left out.</param>
/// <param name="Line">Where its head begins, counted from 1.</param>
/// <param name="Lines">How many lines it takes, head and body.</param>
internal sealed record CodeMember(string Head, int Line, int Lines);
