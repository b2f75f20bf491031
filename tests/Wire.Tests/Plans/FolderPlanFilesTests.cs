using Halfvoice.Plans;
using Halfvoice.Rig.PlanFiles;

namespace Halfvoice.Tests.Plans;

public sealed class FolderPlanFilesTests : IDisposable
{
    private readonly string _folder = Directory.CreateTempSubdirectory("halfvoice-plan-").FullName;

    public void Dispose() => Directory.Delete(_folder, recursive: true);

    [Fact]
    public void A_plan_folder_on_disk_reads_as_the_same_plan()
    {
        Put("plan.yaml", "name: Small\nbase_mva: 100\n");
        Put("grid/buses.csv", "bus,site\nA,north\n");
        Put("grid/lines.csv", "line,from_bus,to_bus,reactance_pu,limit_mw\n");
        Put("grid/generators.csv", "generator,bus,min_mw,max_mw,cost_quadratic,cost_linear,cost_fixed\nG,A,0,10,0,20,0\n");
        Put("loads/north.csv", "bus,load_mw\nA,5\n");
        Put("deeper/than/read.csv", "x");
        Assert.Equal(
            ["grid/buses.csv", "grid/generators.csv", "grid/lines.csv", "loads/north.csv", "plan.yaml"],
            new FolderPlanFiles(_folder).List().Names.Order(StringComparer.Ordinal));
        var reading = PlanReader.Read(new FolderPlanFiles(_folder));
        Assert.Empty(reading.ErrorLines());
        Assert.Equal([5.0], reading.Plan!.LoadMw(1));
    }

    [Fact]
    public void An_empty_folder_a_missing_one_and_a_file_are_told_apart()
    {
        Assert.StartsWith(".: is empty", Only(_folder), StringComparison.Ordinal);
        Assert.Equal(".: is not there: give the path of a plan folder", Only(Path.Combine(_folder, "nowhere")));
        Put("file", "x");
        Assert.Equal(".: is a file: a plan is a folder", Only(Path.Combine(_folder, "file")));
    }

    [Fact]
    public void A_file_above_the_cap_and_a_missing_file_are_problems_in_words()
    {
        Put("plan.yaml", new string('#', 1000));
        var files = new FolderPlanFiles(_folder);
        Assert.Equal(1000, files.Read("plan.yaml", 1000).Bytes!.Length);
        Assert.Equal("is 0.0 MiB large; at most 0 MiB are read", files.Read("plan.yaml", 999).Problem);
        Assert.Equal("is missing", files.Read("grid/buses.csv", 1000).Problem);
        Directory.CreateDirectory(Path.Combine(_folder, "grid"));
        Assert.StartsWith("cannot be read", files.Read("grid", 1000).Problem, StringComparison.Ordinal);
    }

    [Fact]
    public void A_file_that_does_not_know_its_length_is_cut_off_at_the_cap()
    {
        if (!File.Exists("/dev/zero"))
            Assert.Skip("This system has no endless file to read from.");
        File.CreateSymbolicLink(Path.Combine(_folder, "plan.yaml"), "/dev/zero");
        Assert.NotNull(new FolderPlanFiles(_folder).Read("plan.yaml", 100_000).Problem);
    }

    private static string Only(string folder) => Assert.Single(PlanReader.Read(new FolderPlanFiles(folder)).Errors).Text;

    private void Put(string name, string text)
    {
        var path = Path.Combine(_folder, name);
        Directory.CreateDirectory(Path.GetDirectoryName(path)!);
        File.WriteAllText(path, text);
    }
}
