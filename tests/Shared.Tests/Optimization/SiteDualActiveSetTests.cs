using Halfvoice.Optimization;

namespace Halfvoice.Tests.Optimization;

public class SiteDualActiveSetTests
{
    [Fact]
    public void Random_programs_meet_their_optimality_conditions_cold_and_warm()
    {
        int steps = 0, active = 0;
        for (var seed = 0; seed < 400; seed++)
        {
            var program = RandomProgram.From(seed);
            var solver = program.Solver();
            var random = new Random(seed + 1_000_000);
            for (var call = 0; call < 8; call++)
            {
                program.Shake(random);
                active += program.SolveAndCheck(solver, seed, call);
                steps += solver.LastSteps;
            }
        }

        // The programs must not be so loose that nothing is ever active.
        Assert.True(steps > 1000 && active > 5000, $"{steps} steps, {active} active rows");
    }

    [Fact]
    public void A_warm_answer_equals_the_cold_one()
    {
        for (var seed = 0; seed < 200; seed++)
        {
            var program = RandomProgram.From(seed);
            var warm = program.Solver();
            var random = new Random(seed);
            for (var call = 0; call < 5; call++)
            {
                program.Shake(random);
                program.SolveAndCheck(warm, seed, call);
                var expected = program.X.ToArray();
                program.SolveAndCheck(program.Solver(), seed, call);
                for (var j = 0; j < expected.Length; j++)
                    Assert.Equal(expected[j], program.X[j], 1e-8 * (1 + Math.Abs(expected[j])));
            }
        }
    }

    [Fact]
    public void Rounding_does_not_grow_over_thousands_of_warm_solves()
    {
        var program = RandomProgram.From(5);
        var solver = program.Solver();
        var random = new Random(5);
        for (var call = 0; call < 5000; call++)
        {
            program.Shake(random);
            program.SolveAndCheck(solver, 5, call);
        }
    }

    [Fact]
    public void Rows_that_contradict_each_other_are_infeasible_and_the_next_call_recovers()
    {
        var solver = new DualActiveSet([1, 0, 0, 1], 2, [1, 1, 1, 0, 0, 1], 1);
        var x = new double[2];
        var multipliers = new double[3];
        var status = solver.Solve([0, 0], [5, 0, 0], [5, 2, 2], x, multipliers);
        Assert.Equal(DualActiveSetStatus.Infeasible, status);
        Assert.Equal(DualActiveSetStatus.Optimal, solver.Solve([0, 0], [3, 0, 0], [3, 2, 1], x, multipliers));
        Assert.Equal(2, x[0], 1e-12);
        Assert.Equal(1, x[1], 1e-12);
    }

    [Fact]
    public void A_repeated_equality_is_left_out_when_it_agrees_and_infeasible_when_not()
    {
        var solver = new DualActiveSet([2, 0, 0, 2], 2, [1, 1, 2, 2], 2);
        var x = new double[2];
        var multipliers = new double[2];
        Assert.Equal(DualActiveSetStatus.Optimal, solver.Solve([0, 0], [1, 2], [1, 2], x, multipliers));
        Assert.Equal(0.5, x[0], 1e-12);
        Assert.Equal(DualActiveSetStatus.Infeasible, solver.Solve([0, 0], [1, 3], [1, 3], x, multipliers));
    }

    [Fact]
    public void A_row_of_zeros_is_a_condition_on_its_bounds_alone()
    {
        var solver = new DualActiveSet([1], 1, [0], 0);
        Assert.Equal(DualActiveSetStatus.Optimal, solver.Solve([-3], [-1], [1], new double[1], new double[1]));
        Assert.Equal(DualActiveSetStatus.Infeasible, solver.Solve([-3], [1], [2], new double[1], new double[1]));
    }

    [Fact]
    public void Warm_solves_allocate_nothing()
    {
        var program = RandomProgram.From(8);
        var solver = program.Solver();
        var random = new Random(8);
        for (var call = 0; call < 5; call++)
        {
            program.Shake(random);
            program.SolveAndCheck(solver, 8, call);
        }

        var allocated = 0L;
        for (var call = 0; call < 200; call++)
        {
            program.Shake(random);
            var before = GC.GetAllocatedBytesForCurrentThread();
            solver.Solve(program.Linear, program.Lower, program.Upper, program.X, program.Multipliers);
            allocated += GC.GetAllocatedBytesForCurrentThread() - before;
        }

        Assert.Equal(0, allocated);
    }

    [Fact]
    public void What_does_not_fit_is_refused()
    {
        Assert.Throws<ArgumentException>(() => new DualActiveSet([], 0, [], 0));
        Assert.Throws<ArgumentException>(() => new DualActiveSet([1, 0, 0, -1], 2, [], 0));
        Assert.Throws<ArgumentException>(() => new DualActiveSet([1, 0, 0, 1], 2, [1], 0));
        Assert.Throws<ArgumentException>(() => new DualActiveSet([1], 1, [1], 2));
        var solver = new DualActiveSet([1], 1, [1], 0);
        Assert.Throws<ArgumentException>(() => solver.Solve([1, 1], [0], [1], new double[1], new double[1]));
        Assert.Throws<ArgumentException>(() => solver.Solve([1], [0], [1], new double[1], new double[2]));
    }

    /// <summary>A program with a point that is feasible by construction; bounds move around it from call to call.</summary>
    private sealed class RandomProgram
    {
        public required int Variables { get; init; }

        public required int Equalities { get; init; }

        public required double[] Hessian { get; init; }

        public required double[] Rows { get; init; }

        public required double[] Linear { get; init; }

        public required double[] Lower { get; init; }

        public required double[] Upper { get; init; }

        public required double[] X { get; init; }

        public required double[] Multipliers { get; init; }

        public static RandomProgram From(int seed)
        {
            var random = new Random(seed);
            var n = random.Next(1, 15);
            var m = random.Next(0, 30);
            var factor = Enumerable.Range(0, n * n).Select(_ => Signed(random)).ToArray();
            var hessian = new double[n * n];
            for (var i = 0; i < n; i++)
            {
                for (var j = 0; j < n; j++)
                {
                    for (var k = 0; k < n; k++)
                        hessian[(i * n) + j] += factor[(i * n) + k] * factor[(j * n) + k];
                    hessian[(i * n) + j] += i == j ? 0.1 : 0;
                }
            }

            var rows = Enumerable.Range(0, m * n).Select(_ => random.Next(3) == 0 ? 0 : Signed(random)).ToArray();
            for (var j = 0; m > 2 && j < n; j++)
                rows[((m - 1) * n) + j] = 2 * rows[((m - 2) * n) + j];
            return new RandomProgram
            {
                Variables = n,
                Equalities = Math.Min(random.Next(0, 4), Math.Min(m / 3, n - 1)),
                Hessian = hessian,
                Rows = rows,
                Linear = new double[n],
                Lower = new double[m],
                Upper = new double[m],
                X = new double[n],
                Multipliers = new double[m],
            };
        }

        public DualActiveSet Solver() => new(Hessian, Variables, Rows, Equalities);

        public void Shake(Random random)
        {
            var feasible = Enumerable.Range(0, Variables).Select(_ => Signed(random)).ToArray();
            for (var j = 0; j < Variables; j++)
                Linear[j] = 10 * Signed(random);
            for (var i = 0; i < Lower.Length; i++)
            {
                var value = Value(i, feasible);
                var kind = i < Equalities ? 0 : random.Next(1, 6);
                Lower[i] = kind == 1 ? double.NegativeInfinity : kind is 0 or 2 ? value : value - random.NextDouble();
                Upper[i] = kind == 3 ? double.PositiveInfinity : kind == 0 ? value : value + random.NextDouble();
            }
        }

        /// <summary>H x + g = Σ multiplier a, rows met, multipliers of the right sign and 0 off the bounds.</summary>
        public int SolveAndCheck(DualActiveSet solver, int seed, int call)
        {
            var status = solver.Solve(Linear, Lower, Upper, X, Multipliers);
            Assert.True(status == DualActiveSetStatus.Optimal, $"seed {seed}, call {call}: {status}");
            for (var j = 0; j < Variables; j++)
            {
                double gradient = Linear[j], scale = 1 + Math.Abs(Linear[j]);
                for (var k = 0; k < Variables; k++)
                    gradient += Hessian[(j * Variables) + k] * X[k];
                for (var i = 0; i < Lower.Length; i++)
                {
                    gradient -= Multipliers[i] * Rows[(i * Variables) + j];
                    scale += Math.Abs(Multipliers[i]);
                }

                Assert.True(Math.Abs(gradient) <= 1e-8 * scale, $"seed {seed}, call {call}: gradient {gradient}");
            }

            for (var i = 0; i < Lower.Length; i++)
            {
                var value = Value(i, X);
                Assert.True(value >= Lower[i] - 1e-8 && value <= Upper[i] + 1e-8, $"seed {seed}, call {call}: row {i} is not met");
                if (Multipliers[i] > 0)
                    Assert.True(i < Equalities || Math.Abs(value - Lower[i]) < 1e-8, $"seed {seed}, call {call}: row {i} presses in the air");
                if (Multipliers[i] < 0)
                    Assert.True(i < Equalities || Math.Abs(value - Upper[i]) < 1e-8, $"seed {seed}, call {call}: row {i} presses in the air");
            }

            return Multipliers.Count(multiplier => multiplier != 0);
        }

        private double Value(int row, double[] x) => x.Select((value, j) => value * Rows[(row * Variables) + j]).Sum();

        private static double Signed(Random random) => (2 * random.NextDouble()) - 1;
    }
}
