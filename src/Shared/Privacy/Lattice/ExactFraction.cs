using System.Numerics;

namespace Halfvoice.Privacy;

/// <summary>
/// An exact rational number. Noise scales and integer sensitivities are rounded against us, and a floating-point
/// quotient cannot say on which side of an integer it lies.
/// </summary>
public readonly struct ExactFraction : IEquatable<ExactFraction>, IComparable<ExactFraction>
{
    private readonly BigInteger _denominatorLessOne;

    /// <param name="numerator">Any integer.</param>
    /// <param name="denominator">Any integer but 0.</param>
    public ExactFraction(BigInteger numerator, BigInteger denominator)
    {
        if (denominator.IsZero)
            throw new ArgumentException("A fraction needs a denominator other than 0.", nameof(denominator));
        var sign = denominator.Sign;
        var divisor = BigInteger.GreatestCommonDivisor(numerator, denominator);
        Numerator = sign * numerator / divisor;
        _denominatorLessOne = sign * denominator / divisor - 1;
    }

    public BigInteger Numerator { get; }

    /// <summary>Above 0 and without a divisor in common with the numerator.</summary>
    public BigInteger Denominator => _denominatorLessOne + 1;

    /// <summary>The exact value of a finite double.</summary>
    public static ExactFraction FromDouble(double value)
    {
        if (!double.IsFinite(value))
            throw new ArgumentException("Only a finite number has an exact fraction.", nameof(value));
        var bits = BitConverter.DoubleToInt64Bits(value);
        var exponentField = (int)((bits >> 52) & 0x7FF);
        var fractionField = bits & 0xFFFFFFFFFFFFF;
        var mantissa = exponentField == 0 ? fractionField : fractionField | (1L << 52);
        var exponent = Math.Max(exponentField, 1) - 1075;
        return PowerOfTwo(exponent) * (bits < 0 ? -mantissa : mantissa);
    }

    /// <summary>2^exponent.</summary>
    public static ExactFraction PowerOfTwo(int exponent) => exponent >= 0
        ? new ExactFraction(BigInteger.One << exponent, BigInteger.One)
        : new ExactFraction(BigInteger.One, BigInteger.One << -exponent);

    public BigInteger Floor()
    {
        var quotient = BigInteger.DivRem(Numerator, Denominator, out var remainder);
        return remainder.Sign < 0 ? quotient - 1 : quotient;
    }

    public BigInteger Ceiling()
    {
        var quotient = BigInteger.DivRem(Numerator, Denominator, out var remainder);
        return remainder.Sign > 0 ? quotient + 1 : quotient;
    }

    public int CompareTo(ExactFraction other) => (Numerator * other.Denominator).CompareTo(other.Numerator * Denominator);

    public bool Equals(ExactFraction other) => Numerator == other.Numerator && Denominator == other.Denominator;

    public override bool Equals(object? obj) => obj is ExactFraction other && Equals(other);

    public override int GetHashCode() => HashCode.Combine(Numerator, Denominator);

    public static implicit operator ExactFraction(BigInteger value) => new(value, BigInteger.One);

    public static implicit operator ExactFraction(long value) => new(value, BigInteger.One);

    public static ExactFraction operator +(ExactFraction a, ExactFraction b) =>
        new(a.Numerator * b.Denominator + b.Numerator * a.Denominator, a.Denominator * b.Denominator);

    public static ExactFraction operator *(ExactFraction a, ExactFraction b) =>
        new(a.Numerator * b.Numerator, a.Denominator * b.Denominator);

    public static ExactFraction operator /(ExactFraction a, ExactFraction b) =>
        new(a.Numerator * b.Denominator, a.Denominator * b.Numerator);

    public static bool operator ==(ExactFraction a, ExactFraction b) => a.Equals(b);

    public static bool operator !=(ExactFraction a, ExactFraction b) => !a.Equals(b);

    public static bool operator <(ExactFraction a, ExactFraction b) => a.CompareTo(b) < 0;

    public static bool operator >(ExactFraction a, ExactFraction b) => a.CompareTo(b) > 0;

    public static bool operator <=(ExactFraction a, ExactFraction b) => a.CompareTo(b) <= 0;

    public static bool operator >=(ExactFraction a, ExactFraction b) => a.CompareTo(b) >= 0;
}
