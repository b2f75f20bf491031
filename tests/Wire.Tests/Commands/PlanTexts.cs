using System.Text;
using Halfvoice.Tests.Infrastructure;

namespace Halfvoice.Tests.Commands;

/// <summary>A small correct plan on disk, to be broken one way at a time.</summary>
internal sealed class PlanTexts : IDisposable
{
    private readonly TestFolder _folder = new();

    public PlanTexts()
    {
        Put("plan.yaml", "name: Small\nbase_mva: 100\nstop: { mismatch: 2%, price: 1, rounds: 50 }\n");
        Put("grid/buses.csv", "bus,site\nA,north\nB,south\nC,south\n");
        Put("grid/lines.csv", "line,from_bus,to_bus,reactance_pu,limit_mw\nL1,A,B,0.1,80\nL2,B,C,0.2,\nL3,A,C,0.3,60\n");
        Put("grid/generators.csv", "generator,bus,min_mw,max_mw,cost_quadratic,cost_linear,cost_fixed\nG1,A,0,100,0.1,20,0\nG2,C,0,50,0,30,1\n");
        Put("loads/north.csv", "bus,load_mw\nA,10.5\n");
        Put("loads/south.csv", "bus,load_mw\nB,20\nC,3\n");
    }

    public string Folder => _folder.Path;

    public void Put(string file, string text) => Put(file, Encoding.UTF8.GetBytes(text));

    public void Put(string file, byte[] bytes)
    {
        var path = Path.Combine(Folder, file);
        Directory.CreateDirectory(Path.GetDirectoryName(path)!);
        File.WriteAllBytes(path, bytes);
    }

    public void Replace(string file, string old, string replacement)
    {
        var text = File.ReadAllText(Path.Combine(Folder, file));
        Assert.Contains(old, text, StringComparison.Ordinal);
        Put(file, text.Replace(old, replacement, StringComparison.Ordinal));
    }

    public void Dispose() => _folder.Dispose();
}
