using System.Reflection;
using System.Text.RegularExpressions;

namespace Halfvoice.Tests.Conventions;

/// <summary>A line of the ban list: a documentation id (T: a type, P: a property, M: a method) and why it is banned.</summary>
internal sealed record BannedSymbol(char Kind, string Name, string Reason)
{
    private static readonly Lazy<Assembly[]> Known = new(() => [
        .. ((string)AppContext.GetData("TRUSTED_PLATFORM_ASSEMBLIES")!).Split(Path.PathSeparator)
            .Select(Path.GetFileNameWithoutExtension).Where(name => name!.StartsWith("System", StringComparison.Ordinal)
                || name.StartsWith("MathNet", StringComparison.Ordinal)).Select(name => Assembly.Load(name!)),
    ]);

    public static BannedSymbol Parse(string line)
    {
        var parts = line.Split(';', 2);
        Assert.True(parts.Length == 2 && Regex.IsMatch(parts[0], "^[TPM]:."), $"'{line}' is not 'T:, P: or M: id;reason'.");
        return new BannedSymbol(parts[0][0], parts[0][2..], parts[1].Trim());
    }

    /// <summary>Finds what the line names; null where there is no such thing, so that the line would ban nothing.</summary>
    public MemberInfo? Resolve()
    {
        if (Kind == 'T')
            return TypeOf(Name);
        var head = Name.Split('(')[0];
        var dot = head.LastIndexOf('.');
        if (TypeOf(head[..dot]) is not { } owner)
            return null;
        const BindingFlags any = BindingFlags.Public | BindingFlags.Static | BindingFlags.Instance;
        var member = head[(dot + 1)..];
        if (Kind == 'P')
            return owner.GetProperty(member, any);
        var parameters = Name.Contains('(', StringComparison.Ordinal) ? Name[(head.Length + 1)..^1] : string.Empty;
        return member == "#ctor"
            ? owner.GetConstructors().SingleOrDefault(found => Id(found) == parameters)
            : owner.GetMethods(any).SingleOrDefault(found => !found.IsGenericMethod && found.Name == member && Id(found) == parameters);
    }

    /// <summary>A C# statement that uses it.</summary>
    public string Use() => Resolve() switch
    {
        Type type => $"global::System.Console.Equals(typeof(global::{type.FullName}), null);",
        PropertyInfo property => $"Take(global::{property.DeclaringType!.FullName}.{property.Name});",
        ConstructorInfo constructor => $"Take(new global::{constructor.DeclaringType!.FullName}({Arguments(constructor)}));",
        MethodInfo method => $"Take(global::{method.DeclaringType!.FullName}.{method.Name}({Arguments(method)}));",
        _ => throw new InvalidOperationException($"{Kind}:{Name} is nothing that can be used."),
    };

    private static string Arguments(MethodBase method) =>
        string.Join(", ", method.GetParameters().Select(parameter => $"default({Written(parameter.ParameterType)})!"));

    private static string Written(Type type) => type.IsGenericType
        ? $"global::{type.FullName!.Split('`')[0]}<{string.Join(", ", type.GetGenericArguments().Select(Written))}>"
        : $"global::{type.FullName}";

    private static string Id(MethodBase method) => string.Join(',', method.GetParameters().Select(parameter => Id(parameter.ParameterType)));

    private static string Id(Type type) => type.IsGenericType
        ? $"{type.FullName!.Split('`')[0]}{{{string.Join(',', type.GetGenericArguments().Select(Id))}}}"
        : type.FullName!;

    private static Type? TypeOf(string name) => Known.Value.Select(assembly => assembly.GetType(name)).FirstOrDefault(type => type is not null);
}
