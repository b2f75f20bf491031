using System.Globalization;

namespace Halfvoice.Containers;

/// <summary>
/// Settles as which user the containers run. Bundles hold private keys with mode 0600, so whoever owns a bundle is the
/// one who can run with it: the tester, or the images' own unprivileged user where the tester is root.
/// </summary>
internal static class ContainerIdentity
{
    /// <summary>Makes the folder readable by the user who is returned, in the form "uid:gid"; never root.</summary>
    public static async Task<string> HandOverAsync(string folder, CancellationToken cancellation)
    {
        if (!Environment.IsPrivilegedProcess)
        {
            return $"{await NumberAsync("-u", cancellation)}:{await NumberAsync("-g", cancellation)}";
        }

        var owned = await ChildCommand.RunAsync("chown", ["--recursive", Lockdown.UserOfTheImages, folder], cancellation);
        Assert.True(owned.ExitCode == 0, owned.Tail);
        return Lockdown.UserOfTheImages;
    }

    private static async Task<int> NumberAsync(string option, CancellationToken cancellation)
    {
        var answer = await ChildCommand.RunAsync("id", [option], cancellation);
        return int.Parse(answer.Output, CultureInfo.InvariantCulture);
    }
}
