using System.Reflection;

namespace Halfvoice.Rig;

/// <summary>Which code this is.</summary>
public static class BuildStamp
{
    /// <summary>The commit that this was built from, or "unknown" outside a checkout.</summary>
    public static string Commit
    {
        get
        {
            var version = typeof(BuildStamp).Assembly.GetCustomAttribute<AssemblyInformationalVersionAttribute>()?.InformationalVersion ?? string.Empty;
            var plus = version.IndexOf('+', StringComparison.Ordinal);
            return plus >= 0 ? version[(plus + 1)..] : "unknown";
        }
    }
}
