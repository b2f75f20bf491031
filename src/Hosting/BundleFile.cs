using System.Security.Cryptography;
using System.Text.Json;

namespace Halfvoice.Hosting;

/// <summary>Reads a file of a bundle, so that whatever is wrong with it is told with the file's name.</summary>
internal static class BundleFile
{
    /// <param name="bundle">The bundle's folder.</param>
    /// <param name="name">Name of the file in it.</param>
    /// <param name="read">Reads the file at a path.</param>
    /// <exception cref="InvalidDataException">The file is missing, cannot be read, or is not what its name says.</exception>
    public static T Read<T>(string bundle, string name, Func<string, T> read)
    {
        try
        {
            return read(Path.Combine(bundle, name));
        }
        catch (Exception wrong) when (wrong is IOException or UnauthorizedAccessException or JsonException or CryptographicException
            or InvalidDataException or ArgumentException)
        {
            throw new InvalidDataException($"{name} of the bundle cannot be used: {wrong.Message}", wrong);
        }
    }
}
