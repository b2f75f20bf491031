namespace Halfvoice.Optimization;

/// <summary>
/// The site problem of scheme <c>angle</c> for a site of one bus: generators p_g, the site's own angle θ_0 and its
/// copies θ_c of its neighbours' angles.
/// <code>
/// min  Σ c_g(p_g) + Σ_c w_c/2 · (θ_c − a_c)² + V · (shed + spill)
/// s.t. Σ p_g − load + shed − spill = Σ_l b_l (θ_0 − θ_c(l)),   |b_l (θ_0 − θ_c(l))| ≤ limit_l,   shed, spill ≥ 0
/// </code>
/// Shedding and spilling make every load feasible and keep the price within [−V, V]. Not safe for concurrent use:
/// each instance has one set of buffers. <see cref="Solve"/> allocates nothing and remembers nothing.
/// </summary>
/// <remarks>
/// Parallel lines carry flows in fixed proportion, so each neighbour is one line of susceptance B_c = Σ b_l (of any
/// sign, even 0) whose angle difference δ_c = θ_0 − θ_c stays within D_c = min limit_l / |b_l|. At a price ν the angle
/// part is strictly convex and solved by
/// <code>
/// δ_c = clip(θ_0 − a_c − ν·B_c/w_c, −D_c, D_c),     w_0 (θ_0 − a_0) + Σ_c w_c (θ_c − a_c) = 0.               (1)
/// </code>
/// With the set of differences at their limits known, θ_0 and the outflow Σ B_c δ_c are affine in ν:
/// <code>
/// θ_0 = (A − ν·B_F)/W,  W = w_0 + Σ_limited w_c,  A = w_0 a_0 + Σ_limited w_c (a_c ± D_c),  B_F = Σ_free B_c  (2)
/// outflow' = −B_F²/W − Σ_free B_c²/w_c ≤ 0.                                                                   (3)
/// </code>
/// So the balance supply(ν) − load − outflow(ν) never falls in ν, and one piece of the outflow meets the whole supply
/// curve in one binary search. The solver hops from piece to piece: where the crossing lies outside the piece, the end
/// of the piece bounds the price from that side, so no piece is met twice and the last one gives the exact answer.
/// An edge that is not short of the crossing says that the piece does hold it and only rounding denied it.
/// </remarks>
public sealed class NodalAngleProblem
{
    /// <summary>Every fourth hop halves the bracket, so 64 halvings exhaust the 53 bits of a double and some exponent.</summary>
    private const int HopsMax = 256;

    /// <summary>Relative rounding allowance when asking whether a difference is within its limit.</summary>
    private const double Rounding = 1e-13;

    private readonly SupplyCurve _supply;
    private readonly double _unservedPrice;
    private readonly double _ownWeight;
    private readonly Neighbour[] _neighbours;

    /// <summary>Sets up the problem; everything here stays constant from round to round.</summary>
    /// <param name="supply">The generators of the bus.</param>
    /// <param name="copyWeights">w_c, $/rad²h, more than 0; the site's own angle first, then each neighbour.</param>
    /// <param name="lines">Every line of the bus, none for a bus on its own.</param>
    /// <param name="unservedPricePerMwh">V, $/MWh, more than 0 and finite.</param>
    /// <exception cref="ArgumentException">A weight, line or price breaks the rules above.</exception>
    public NodalAngleProblem(
        SupplyCurve supply, ReadOnlySpan<double> copyWeights, IReadOnlyList<NodalLine> lines, double unservedPricePerMwh)
    {
        ArgumentNullException.ThrowIfNull(supply);
        ArgumentNullException.ThrowIfNull(lines);
        if (!(unservedPricePerMwh > 0) || !double.IsFinite(unservedPricePerMwh))
            throw new ArgumentException("The price of unserved load must be positive and finite.", nameof(unservedPricePerMwh));
        if (copyWeights.IsEmpty)
            throw new ArgumentException("The first weight is that of the site's own angle; it is missing.", nameof(copyWeights));
        foreach (var weight in copyWeights)
        {
            if (!(weight > 0) || !double.IsFinite(weight))
                throw new ArgumentException("Every copy needs a positive, finite weight.", nameof(copyWeights));
        }

        _supply = supply;
        _unservedPrice = unservedPricePerMwh;
        _ownWeight = copyWeights[0];
        _neighbours = new Neighbour[copyWeights.Length - 1];
        for (var c = 0; c < _neighbours.Length; c++)
            _neighbours[c] = new Neighbour { Weight = copyWeights[c + 1], LimitRad = double.PositiveInfinity };
        foreach (var line in lines)
            Fold(line);
        foreach (ref var neighbour in _neighbours.AsSpan())
            neighbour.SusceptanceOverWeight = neighbour.Susceptance / neighbour.Weight;
    }

    /// <summary>Number of angles in and out: the site's own and one per neighbour.</summary>
    public int CopyCount => _neighbours.Length + 1;

    /// <summary>Solves for one load and one set of anchors.</summary>
    /// <param name="loadMw">MW; may be negative.</param>
    /// <param name="anchorRad">a_c, rad, one per copy, own first.</param>
    /// <param name="copiesRad">Receives θ_c, rad, in the same order.</param>
    /// <returns>Price, output and unserved load.</returns>
    /// <exception cref="ArgumentException">A span has the wrong length, or a number is not finite.</exception>
    public NodalAngleSolution Solve(double loadMw, ReadOnlySpan<double> anchorRad, Span<double> copiesRad)
    {
        Check(loadMw, anchorRad, copiesRad);
        var ownAnchor = anchorRad[0];
        for (var c = 0; c < _neighbours.Length; c++)
        {
            _neighbours[c].AnchorRad = anchorRad[c + 1];
            _neighbours[c].Side = 0;
        }

        double low = -_unservedPrice, high = _unservedPrice, located = double.NaN, price = 0;
        for (var hop = 0; hop < HopsMax; hop++)
        {
            var piece = DescribePiece(ownAnchor);
            price = Math.Clamp(
                _supply.CrossingPrice(loadMw + piece.OutflowAtZeroMw, piece.OutflowSlope), -_unservedPrice, _unservedPrice);
            if (Holds(piece, price))
                break;
            if (hop > 0)
            {
                var direction = Math.Sign(price - located);
                var edge = EdgeOf(piece, located, direction);
                if (!(direction * (price - edge) > 0))
                    break;
                if (direction > 0)
                    low = Math.Max(low, edge);
                else
                    high = Math.Min(high, edge);
                if (!(high - low > double.Epsilon + (1e-15 * (Math.Abs(low) + Math.Abs(high)))))
                {
                    price = edge;
                    break;
                }
            }

            located = hop % 4 != 3 && price > low && price < high ? price : low + (0.5 * (high - low));
            Locate(ownAnchor, located);
        }

        return Finish(loadMw, price, ownAnchor, copiesRad);
    }

    /// <summary>Equations (2) and (3) for the sides now noted.</summary>
    private Piece DescribePiece(double ownAnchor)
    {
        double weight = _ownWeight, moment = _ownWeight * ownAnchor, free = 0, slope = 0, outflow = 0;
        foreach (ref readonly var neighbour in _neighbours.AsSpan())
        {
            if (neighbour.Side == 0)
            {
                free += neighbour.Susceptance;
                slope -= neighbour.Susceptance * neighbour.SusceptanceOverWeight;
                outflow -= neighbour.Susceptance * neighbour.AnchorRad;
            }
            else
            {
                var limit = neighbour.Side * neighbour.LimitRad;
                weight += neighbour.Weight;
                moment += neighbour.Weight * (neighbour.AnchorRad + limit);
                outflow += neighbour.Susceptance * limit;
            }
        }

        var angle = moment / weight;
        var angleSlope = -free / weight;
        return new Piece(angle, angleSlope, outflow + (free * angle), slope + (free * angleSlope));
    }

    /// <summary>Whether the noted sides are the right ones at a price, to rounding.</summary>
    private bool Holds(in Piece piece, double price)
    {
        var angle = piece.AngleAtZeroRad + (price * piece.AngleSlope);
        foreach (ref readonly var neighbour in _neighbours.AsSpan())
        {
            var push = price * neighbour.SusceptanceOverWeight;
            var difference = angle - neighbour.AnchorRad - push;
            var slack = Rounding * (Math.Abs(angle) + Math.Abs(neighbour.AnchorRad) + Math.Abs(push));
            var right = neighbour.Side == 0
                ? Math.Abs(difference) <= neighbour.LimitRad + slack
                : neighbour.Side * difference >= neighbour.LimitRad - slack;
            if (!right)
                return false;
        }

        return true;
    }

    /// <summary>The price at which, going from <paramref name="price"/> in a direction, the first difference changes side.</summary>
    private double EdgeOf(in Piece piece, double price, int direction)
    {
        var nearest = double.PositiveInfinity;
        var angle = piece.AngleAtZeroRad + (price * piece.AngleSlope);
        foreach (ref readonly var neighbour in _neighbours.AsSpan())
        {
            var difference = angle - neighbour.AnchorRad - (price * neighbour.SusceptanceOverWeight);
            var slope = direction * (piece.AngleSlope - neighbour.SusceptanceOverWeight);
            var heading = Math.Sign(slope);
            var ahead = neighbour.Side == 0 ? heading : -heading == neighbour.Side ? neighbour.Side : 0;
            if (ahead != 0)
                nearest = Math.Min(nearest, Math.Max(0, ((ahead * neighbour.LimitRad) - difference) / slope));
        }

        return price + (direction * nearest);
    }

    /// <summary>
    /// Notes each difference's side at a price by solving (1) for θ_0. Its left-hand side rises piecewise linearly with
    /// kinks at a_c + ν·B_c/w_c ± D_c; a kink inside the bracket is tried and becomes one of its ends, so that no kink
    /// is left inside when all have been seen.
    /// </summary>
    private void Locate(double ownAnchor, double price)
    {
        var neighbours = _neighbours.AsSpan();
        foreach (ref var neighbour in neighbours)
        {
            var centre = neighbour.AnchorRad + (price * neighbour.SusceptanceOverWeight);
            (neighbour.LowKinkRad, neighbour.HighKinkRad) = (centre - neighbour.LimitRad, centre + neighbour.LimitRad);
        }

        double low = double.NegativeInfinity, high = double.PositiveInfinity;
        foreach (ref readonly var neighbour in neighbours)
        {
            Try(neighbour.LowKinkRad, ownAnchor, price, ref low, ref high);
            Try(neighbour.HighKinkRad, ownAnchor, price, ref low, ref high);
        }

        foreach (ref var neighbour in neighbours)
            neighbour.Side = low >= neighbour.HighKinkRad ? 1 : high <= neighbour.LowKinkRad ? -1 : 0;
    }

    private void Try(double kink, double ownAnchor, double price, ref double low, ref double high)
    {
        if (!(kink > low && kink < high))
            return;
        if (Moment(ownAnchor, price, kink) < 0)
            low = kink;
        else
            high = kink;
    }

    /// <summary>Left-hand side of the second equation of (1): a free neighbour pulls with ν·B_c whatever the angle.</summary>
    private double Moment(double ownAnchor, double price, double angle)
    {
        var moment = _ownWeight * (angle - ownAnchor);
        foreach (ref readonly var neighbour in _neighbours.AsSpan())
        {
            var pull = angle > neighbour.HighKinkRad ? angle - neighbour.HighKinkRad
                : angle < neighbour.LowKinkRad ? angle - neighbour.LowKinkRad : 0;
            moment += (price * neighbour.Susceptance) + (neighbour.Weight * pull);
        }

        return moment;
    }

    private NodalAngleSolution Finish(double loadMw, double price, double ownAnchor, Span<double> copiesRad)
    {
        var piece = DescribePiece(ownAnchor);
        var angle = piece.AngleAtZeroRad + (price * piece.AngleSlope);
        copiesRad[0] = angle;
        var needMw = loadMw;
        for (var c = 0; c < _neighbours.Length; c++)
        {
            ref readonly var neighbour = ref _neighbours[c];
            var limit = neighbour.LimitRad;
            var difference = neighbour.Side == 0
                ? Math.Min(limit, Math.Max(-limit, angle - neighbour.AnchorRad - (price * neighbour.SusceptanceOverWeight)))
                : neighbour.Side * limit;
            copiesRad[c + 1] = angle - difference;
            needMw += neighbour.Susceptance * difference;
        }

        if (Math.Abs(price) < _unservedPrice)
            return new NodalAngleSolution(price, Math.Clamp(needMw, _supply.MinMw, _supply.MaxMw), 0);
        var outputMw = Math.Clamp(needMw, _supply.Supply(price, tieHigh: false), _supply.Supply(price, tieHigh: true));
        var unservedMw = needMw - outputMw;
        return new NodalAngleSolution(price, outputMw, price > 0 ? Math.Max(unservedMw, 0) : Math.Min(unservedMw, 0));
    }

    private void Fold(NodalLine line)
    {
        if (line.Copy < 1 || line.Copy > _neighbours.Length)
            throw new ArgumentException($"A line names copy {line.Copy}; neighbours are copies 1 to {_neighbours.Length}.");
        if (!double.IsFinite(line.SusceptanceMwPerRad) || line.SusceptanceMwPerRad == 0)
            throw new ArgumentException("A line needs a finite susceptance other than 0.");
        if (!(line.LimitMw >= 0))
            throw new ArgumentException("A line's limit must be 0 MW or more, or positive infinity.");
        ref var neighbour = ref _neighbours[line.Copy - 1];
        neighbour.Susceptance += line.SusceptanceMwPerRad;
        neighbour.LimitRad = Math.Min(neighbour.LimitRad, line.LimitMw / Math.Abs(line.SusceptanceMwPerRad));
    }

    private void Check(double loadMw, ReadOnlySpan<double> anchorRad, Span<double> copiesRad)
    {
        if (anchorRad.Length != CopyCount || copiesRad.Length != CopyCount)
            throw new ArgumentException($"This site has {CopyCount} angles; the anchors or copies given are not as many.");
        if (!double.IsFinite(loadMw))
            throw new ArgumentException("A load must be a finite number of MW.", nameof(loadMw));
        foreach (var anchor in anchorRad)
        {
            if (!double.IsFinite(anchor))
                throw new ArgumentException("Every anchor must be a finite angle.", nameof(anchorRad));
        }
    }

    /// <summary>One affine piece: θ_0 and outflow at price 0, with their slopes per $/MWh.</summary>
    private readonly record struct Piece(double AngleAtZeroRad, double AngleSlope, double OutflowAtZeroMw, double OutflowSlope);

    /// <summary>All lines to one neighbour, with the state of the solve under way: B_c (MW/rad), w_c, D_c and the rest.</summary>
    private struct Neighbour
    {
        public double Weight;
        public double Susceptance;
        public double SusceptanceOverWeight;
        public double LimitRad;
        public double AnchorRad;
        public double LowKinkRad;
        public double HighKinkRad;

        /// <summary>−1 or 1 at that limit, 0 within.</summary>
        public int Side;
    }
}
