using Halfvoice.Plans;

namespace Halfvoice.Tests.Plans;

/// <summary>A small correct plan as texts, to be broken one way at a time.</summary>
internal sealed class PlanTexts
{
    public Dictionary<string, string> Files { get; } = new()
    {
        ["plan.yaml"] = "name: Small\nbase_mva: 100\n",
        ["grid/buses.csv"] = "bus,site,name,x,y\nA,north,A town,0,1\nB,south,,2,3\nC,south,,,\n",
        ["grid/lines.csv"] = "line,from_bus,to_bus,reactance_pu,limit_mw\nL1,A,B,0.1,50\nL2,B,C,0.2,\nL3,A,C,-0.3,40\n",
        ["grid/generators.csv"] = "generator,bus,min_mw,max_mw,cost_quadratic,cost_linear,cost_fixed\nG1,A,0,100,0.1,20,0\nG2,C,-5,50,0,30,1\n",
        ["loads/north.csv"] = "bus,load_mw\nA,10.5\n",
        ["loads/south.csv"] = "bus,load_mw\nB,20\nC,-3\n",
    };

    public PlanTexts With(string file, string text)
    {
        Files[file] = text;
        return this;
    }

    public PlanTexts Without(string file)
    {
        Files.Remove(file);
        return this;
    }

    public PlanTexts Replacing(string file, string old, string replacement)
    {
        Assert.Contains(old, Files[file], StringComparison.Ordinal);
        Files[file] = Files[file].Replace(old, replacement, StringComparison.Ordinal);
        return this;
    }

    public PlanReading Read() => PlanReader.Read(new MemoryPlanFiles(Files));

    /// <summary>The texts of all errors, which there must be.</summary>
    public string[] Errors()
    {
        var reading = Read();
        Assert.Null(reading.Plan);
        Assert.NotEmpty(reading.Errors);
        return [.. reading.Errors.Select(error => error.Text)];
    }

    /// <summary>The one error that there must be.</summary>
    public string OnlyError() => Assert.Single(Errors());
}
