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
    private readonly double[] _weight;
    private readonly double[] _susceptance;
    private readonly double[] _limitRad;
    private readonly double[] _susceptanceOverWeight;
    private readonly double[] _centreRad;
    private readonly int[] _side;

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
        _weight = copyWeights[1..].ToArray();
        var count = _weight.Length;
        _susceptance = new double[count];
        _limitRad = new double[count];
        Array.Fill(_limitRad, double.PositiveInfinity);
        foreach (var line in lines)
            Fold(line);
        _susceptanceOverWeight = _susceptance.Zip(_weight, (susceptance, weight) => susceptance / weight).ToArray();
        _centreRad = new double[count];
        _side = new int[count];
    }

    /// <summary>Number of angles in and out: the site's own and one per neighbour.</summary>
    public int CopyCount => _weight.Length + 1;

    /// <summary>Solves for one load and one set of anchors.</summary>
    /// <param name="loadMw">MW; may be negative.</param>
    /// <param name="anchorRad">a_c, rad, one per copy, own first.</param>
    /// <param name="copiesRad">Receives θ_c, rad, in the same order.</param>
    /// <returns>Price, output and unserved load.</returns>
    /// <exception cref="ArgumentException">A span has the wrong length, or a number is not finite.</exception>
    public NodalAngleSolution Solve(double loadMw, ReadOnlySpan<double> anchorRad, Span<double> copiesRad)
    {
        Check(loadMw, anchorRad, copiesRad);
        var anchors = anchorRad[1..];
        double low = -_unservedPrice, high = _unservedPrice;
        Array.Clear(_side);
        var located = double.NaN;
        var price = 0.0;
        for (var hop = 0; hop < HopsMax; hop++)
        {
            var piece = DescribePiece(anchorRad[0], anchors);
            price = Math.Clamp(
                _supply.CrossingPrice(loadMw + piece.OutflowAtZeroMw, piece.OutflowSlope), -_unservedPrice, _unservedPrice);
            if (Holds(piece, price, anchors))
                break;
            if (hop > 0)
            {
                var direction = Math.Sign(price - located);
                var edge = EdgeOf(piece, located, direction, anchors);
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
            Locate(anchorRad[0], anchors, located);
        }

        return Finish(loadMw, price, anchorRad[0], anchors, copiesRad);
    }

    /// <summary>Equations (2) and (3) for the sides now noted.</summary>
    private Piece DescribePiece(double ownAnchor, ReadOnlySpan<double> anchors)
    {
        double weight = _ownWeight, moment = _ownWeight * ownAnchor, free = 0, slope = 0, outflow = 0;
        for (var c = 0; c < anchors.Length; c++)
        {
            if (_side[c] == 0)
            {
                free += _susceptance[c];
                slope -= _susceptance[c] * _susceptanceOverWeight[c];
                outflow -= _susceptance[c] * anchors[c];
            }
            else
            {
                var limit = _side[c] * _limitRad[c];
                weight += _weight[c];
                moment += _weight[c] * (anchors[c] + limit);
                outflow += _susceptance[c] * limit;
            }
        }

        var angle = moment / weight;
        var angleSlope = -free / weight;
        return new Piece(angle, angleSlope, outflow + (free * angle), slope + (free * angleSlope));
    }

    /// <summary>Whether the noted sides are the right ones at a price, to rounding.</summary>
    private bool Holds(in Piece piece, double price, ReadOnlySpan<double> anchors)
    {
        var angle = piece.AngleAtZeroRad + (price * piece.AngleSlope);
        for (var c = 0; c < anchors.Length; c++)
        {
            var push = price * _susceptanceOverWeight[c];
            var difference = angle - anchors[c] - push;
            var limit = _limitRad[c];
            var slack = Rounding * (Math.Abs(angle) + Math.Abs(anchors[c]) + Math.Abs(push));
            var right = _side[c] == 0
                ? Math.Abs(difference) <= limit + slack
                : _side[c] * difference >= limit - slack;
            if (!right)
                return false;
        }

        return true;
    }

    /// <summary>The price at which, going from <paramref name="price"/> in a direction, the first difference changes side.</summary>
    private double EdgeOf(in Piece piece, double price, int direction, ReadOnlySpan<double> anchors)
    {
        var nearest = double.PositiveInfinity;
        var angle = piece.AngleAtZeroRad + (price * piece.AngleSlope);
        for (var c = 0; c < anchors.Length; c++)
        {
            var difference = angle - anchors[c] - (price * _susceptanceOverWeight[c]);
            var slope = direction * (piece.AngleSlope - _susceptanceOverWeight[c]);
            var ahead = _side[c] == 0 ? Math.Sign(slope) : -Math.Sign(slope) == _side[c] ? _side[c] : 0;
            if (ahead != 0)
                nearest = Math.Min(nearest, Math.Max(0, ((ahead * _limitRad[c]) - difference) / slope));
        }

        return price + (direction * nearest);
    }

    /// <summary>
    /// Notes each difference's side at a price by solving (1) for θ_0. Its left-hand side rises piecewise linearly with
    /// kinks at a_c + ν·B_c/w_c ± D_c; a kink inside the bracket is tried and becomes one of its ends, so that no kink
    /// is left inside when all have been seen.
    /// </summary>
    private void Locate(double ownAnchor, ReadOnlySpan<double> anchors, double price)
    {
        for (var c = 0; c < anchors.Length; c++)
            _centreRad[c] = anchors[c] + (price * _susceptanceOverWeight[c]);
        double low = double.NegativeInfinity, high = double.PositiveInfinity;
        for (var c = 0; c < anchors.Length; c++)
        {
            for (var side = -1; side <= 1; side += 2)
            {
                var kink = _centreRad[c] + (side * _limitRad[c]);
                if (!(kink > low && kink < high))
                    continue;
                if (Moment(ownAnchor, anchors, kink) < 0)
                    low = kink;
                else
                    high = kink;
            }
        }

        for (var c = 0; c < anchors.Length; c++)
            _side[c] = low >= _centreRad[c] + _limitRad[c] ? 1 : high <= _centreRad[c] - _limitRad[c] ? -1 : 0;
    }

    /// <summary>Left-hand side of the second equation of (1).</summary>
    private double Moment(double ownAnchor, ReadOnlySpan<double> anchors, double angle)
    {
        var moment = _ownWeight * (angle - ownAnchor);
        for (var c = 0; c < anchors.Length; c++)
        {
            var limit = _limitRad[c];
            var difference = Math.Min(limit, Math.Max(-limit, angle - _centreRad[c]));
            moment += _weight[c] * (angle - difference - anchors[c]);
        }

        return moment;
    }

    private NodalAngleSolution Finish(
        double loadMw, double price, double ownAnchor, ReadOnlySpan<double> anchors, Span<double> copiesRad)
    {
        var piece = DescribePiece(ownAnchor, anchors);
        var angle = piece.AngleAtZeroRad + (price * piece.AngleSlope);
        copiesRad[0] = angle;
        var needMw = loadMw;
        for (var c = 0; c < anchors.Length; c++)
        {
            var limit = _limitRad[c];
            var difference = _side[c] == 0
                ? Math.Min(limit, Math.Max(-limit, angle - anchors[c] - (price * _susceptanceOverWeight[c])))
                : _side[c] * limit;
            copiesRad[c + 1] = angle - difference;
            needMw += _susceptance[c] * difference;
        }

        if (Math.Abs(price) < _unservedPrice)
            return new NodalAngleSolution(price, Math.Clamp(needMw, _supply.MinMw, _supply.MaxMw), 0);
        var outputMw = Math.Clamp(needMw, _supply.Supply(price, tieHigh: false), _supply.Supply(price, tieHigh: true));
        var unservedMw = needMw - outputMw;
        return new NodalAngleSolution(price, outputMw, price > 0 ? Math.Max(unservedMw, 0) : Math.Min(unservedMw, 0));
    }

    private void Fold(NodalLine line)
    {
        if (line.Copy < 1 || line.Copy > _weight.Length)
            throw new ArgumentException($"A line names copy {line.Copy}; neighbours are copies 1 to {_weight.Length}.");
        if (!double.IsFinite(line.SusceptanceMwPerRad) || line.SusceptanceMwPerRad == 0)
            throw new ArgumentException("A line needs a finite susceptance other than 0.");
        if (!(line.LimitMw >= 0))
            throw new ArgumentException("A line's limit must be 0 MW or more, or positive infinity.");
        var c = line.Copy - 1;
        _susceptance[c] += line.SusceptanceMwPerRad;
        _limitRad[c] = Math.Min(_limitRad[c], line.LimitMw / Math.Abs(line.SusceptanceMwPerRad));
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
}
