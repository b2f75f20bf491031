using System.Text.Json;
using System.Text.Json.Serialization;
using Halfvoice.Plans;

namespace Halfvoice.Coordination;

/// <summary>The bundles' JSON: snake_case, readable, without reflection.</summary>
[JsonSourceGenerationOptions(
    PropertyNamingPolicy = JsonKnownNamingPolicy.SnakeCaseLower,
    WriteIndented = true,
    UseStringEnumConverter = true,
    NumberHandling = JsonNumberHandling.AllowNamedFloatingPointLiterals,
    UnmappedMemberHandling = JsonUnmappedMemberHandling.Disallow)]
[JsonSerializable(typeof(SiteSetup))]
[JsonSerializable(typeof(CoordinatorSetup))]
[JsonSerializable(typeof(PrivacySettings))]
public sealed partial class SetupJson : JsonSerializerContext
{
    public static string Write(SiteSetup setup) => JsonSerializer.Serialize(setup, Default.SiteSetup);

    public static string Write(CoordinatorSetup setup) => JsonSerializer.Serialize(setup, Default.CoordinatorSetup);

    /// <exception cref="JsonException">The text is not a site's setup; the message says where.</exception>
    public static SiteSetup ReadSite(string json) =>
        JsonSerializer.Deserialize(json, Default.SiteSetup) ?? throw new JsonException("The file is empty.");

    /// <exception cref="JsonException">The text is not a coordinator's setup; the message says where.</exception>
    public static CoordinatorSetup ReadCoordinator(string json) =>
        JsonSerializer.Deserialize(json, Default.CoordinatorSetup) ?? throw new JsonException("The file is empty.");
}
