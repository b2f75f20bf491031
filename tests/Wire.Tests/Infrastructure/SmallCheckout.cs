namespace Halfvoice.Tests.Infrastructure;

/// <summary>A source checkout with an agent and a coordinator that only say their names, so that builds of it are short.</summary>
internal sealed class SmallCheckout : IDisposable
{
    private readonly TestFolder _folder = new();

    public SmallCheckout()
    {
        File.WriteAllText(_folder.File("Agents.sln"), "");
        Write("Agent", "halfvoice-agent", "the agent");
        Write("Coordinator", "halfvoice-coordinator", "the coordinator");
    }

    /// <summary>A folder as deep in it as a rig's output would be.</summary>
    public string RigFolder => Directory.CreateDirectory(Path.Combine(_folder.Path, "src", "Rig", "bin", "Release")).FullName;

    public string At(params string[] parts) => Path.Combine([_folder.Path, .. parts]);

    public void Write(string project, string assembly, string says)
    {
        var source = Directory.CreateDirectory(Path.Combine(_folder.Path, "src", project)).FullName;
        File.WriteAllText(Path.Combine(source, "Program.cs"), $"System.Console.WriteLine(\"{says}\");\n");
        File.WriteAllText(
            Path.Combine(source, project + ".csproj"),
            $"""
            <Project Sdk="Microsoft.NET.Sdk">
              <PropertyGroup>
                <OutputType>Exe</OutputType>
                <TargetFramework>net10.0</TargetFramework>
                <AssemblyName>{assembly}</AssemblyName>
                <PublishAot>true</PublishAot>
                <InvariantGlobalization>true</InvariantGlobalization>
              </PropertyGroup>
            </Project>
            """);
    }

    /// <summary>A folder for the front of PATH with a C compiler that always fails.</summary>
    public string BrokenCompiler()
    {
        var folder = Directory.CreateDirectory(Path.Combine(_folder.Path, "broken")).FullName;
        foreach (var name in new[] { "clang", "gcc" })
        {
            var path = Path.Combine(folder, name);
            File.WriteAllText(path, "#!/bin/sh\necho 'this compiler is broken' >&2\nexit 1\n");
            if (!OperatingSystem.IsWindows())
                File.SetUnixFileMode(path, UnixFileMode.UserRead | UnixFileMode.UserWrite | UnixFileMode.UserExecute);
        }

        return folder;
    }

    public void Dispose() => _folder.Dispose();
}
