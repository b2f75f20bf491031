using Halfvoice.Benchmarks;

// Every figure is a ratio to a baseline measured in the same run; README says how to read them.
var rest = args.Skip(1).ToArray();
switch (args.FirstOrDefault())
{
    case "optimum":
        return OptimumBenchmark.Run(rest);
    case "sites":
        return SiteProblemBenchmark.Run(rest);
    case "exchange":
        return ExchangeBenchmark.Run(rest);
    default:
        Console.Error.WriteLine("Benchmarks: optimum [quick] | sites | exchange [--clients 12,118] [--rounds 1000] [--components 1] [--jit]");
        return 64;
}
