"""p-adic numbers with an absolute precision that is never more than what is known.

A number is u * p^v + O(p^n) with u prime to p and v < n, or zero to the known precision: O(p^n).
Every operation returns the largest precision that holds for all numbers its operands may stand for.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from math import isqrt

from sieve.errors import BadReduction, InternalError, PrecisionLost


def valuation(value: int | Fraction, prime: int) -> int:
    """The exponent of `prime` in a nonzero rational number.

    Raises `InternalError` for zero, whose valuation is infinite.

    >>> valuation(Fraction(50, 49), 7), valuation(50, 5)
    (-2, 2)
    """
    if value == 0:
        raise InternalError("the valuation of zero was asked for")
    count = 0
    top, bottom = value.numerator, value.denominator
    while top % prime == 0:
        top //= prime
        count += 1
    while bottom % prime == 0:
        bottom //= prime
        count -= 1
    return count


@dataclass(frozen=True, slots=True)
class PadicNumber:
    """The ball unit * prime^valuation + O(prime^precision) in Q_p.

    Fields: `prime` (a prime; checked where files are read, not here); `unit` (0 < unit < prime^(precision -
    valuation), prime to `prime`; 0 for zero to the known precision); `valuation` (equal to `precision` for
    zero); `precision` (absolute, may be negative).  Use `padic`, `from_fraction` or `zero` to make one:
    they normalise.  Equality is equality of balls: same digits, same precision; `agrees` compares values.

    Conventions: operands of type int and Fraction are exact.  An exact zero times a number keeps the
    precision of that number, for want of an exact p-adic zero.
    """

    prime: int
    unit: int
    valuation: int
    precision: int

    def __post_init__(self) -> None:
        if self.unit == 0:
            normal = self.valuation == self.precision
        else:
            digits = self.precision - self.valuation
            normal = digits > 0 and self.unit % self.prime != 0 and 0 < self.unit < self.prime**digits
        if not normal:
            raise InternalError(
                f"p-adic number not normalised: {self.unit}, {self.valuation}, {self.precision}"
            )

    @staticmethod
    def padic(prime: int, value: int, shift: int, precision: int) -> PadicNumber:
        """The number value * prime^shift + O(prime^precision); any integers.

        >>> str(PadicNumber.padic(7, 26, 0, 6))
        '5 + 3*7 + O(7^6)'
        """
        if precision <= shift:
            return PadicNumber(prime, 0, precision, precision)
        value %= prime ** (precision - shift)
        if value == 0:
            return PadicNumber(prime, 0, precision, precision)
        extra = valuation(value, prime)
        return PadicNumber(prime, value // prime**extra, shift + extra, precision)

    @staticmethod
    def zero(prime: int, precision: int) -> PadicNumber:
        """The ball O(prime^precision)."""
        return PadicNumber(prime, 0, precision, precision)

    @staticmethod
    def from_fraction(value: int | Fraction, prime: int, precision: int) -> PadicNumber:
        """A rational number to absolute precision `precision`; its denominator may contain `prime`.

        >>> str(PadicNumber.from_fraction(Fraction(1, 14), 7, 2))
        '4*7^-1 + 3 + 3*7 + O(7^2)'
        """
        if value == 0:
            return PadicNumber.zero(prime, precision)
        low = valuation(value, prime)
        if low >= precision:
            return PadicNumber.zero(prime, precision)
        unit = Fraction(value) / Fraction(prime) ** low
        modulus = prime ** (precision - low)
        digits = unit.numerator * pow(unit.denominator, -1, modulus) % modulus
        return PadicNumber(prime, digits, low, precision)

    @property
    def is_zero(self) -> bool:
        """Zero to the known precision."""
        return self.unit == 0

    @property
    def digits(self) -> int:
        """The number of known significant digits (0 for zero)."""
        return self.precision - self.valuation

    @property
    def is_integral(self) -> bool:
        """Every number of the ball is a p-adic integer."""
        return self.valuation >= 0

    def residue(self, exponent: int) -> int:
        """The residue modulo prime^exponent, in [0, prime^exponent), exponent >= 0.

        Raises `PrecisionLost` when the number is known modulo a lower power only, `BadReduction` when it is
        not a p-adic integer.

        >>> PadicNumber.from_fraction(Fraction(1, 2), 7, 3).residue(1)
        4
        """
        if self.precision < exponent:
            raise PrecisionLost(self.prime, self.precision, exponent, f"residue of {self}")
        if self.valuation < 0:
            raise BadReduction(self.prime, f"{self} is not integral")
        modulus: int = self.prime**exponent
        return self.unit * self.prime**self.valuation % modulus

    def to_precision(self, precision: int) -> PadicNumber:
        """The same number with absolute precision at most `precision`; digits are never invented."""
        if precision >= self.precision:
            return self
        return PadicNumber.padic(self.prime, self.unit, self.valuation, precision)

    def _exact(self, value: int | Fraction, precision: int) -> PadicNumber:
        return PadicNumber.from_fraction(value, self.prime, precision)

    def _same_prime(self, other: PadicNumber) -> None:
        if other.prime != self.prime:
            raise InternalError(f"numbers for {self.prime} and {other.prime} meet in one operation")

    def __add__(self, other: PadicNumber | int | Fraction) -> PadicNumber:
        if isinstance(other, (int, Fraction)):
            other = self._exact(other, self.precision)
        self._same_prime(other)
        shift = min(self.valuation, other.valuation)
        total = self.unit * self.prime ** (self.valuation - shift)
        total += other.unit * self.prime ** (other.valuation - shift)
        return PadicNumber.padic(self.prime, total, shift, min(self.precision, other.precision))

    __radd__ = __add__

    def __neg__(self) -> PadicNumber:
        return PadicNumber.padic(self.prime, -self.unit, self.valuation, self.precision)

    def __sub__(self, other: PadicNumber | int | Fraction) -> PadicNumber:
        return self + (-other)

    def __rsub__(self, other: int | Fraction) -> PadicNumber:
        return -self + other

    def __mul__(self, other: PadicNumber | int | Fraction) -> PadicNumber:
        if isinstance(other, (int, Fraction)):
            if other == 0:
                return PadicNumber.zero(self.prime, self.precision)
            # one digit more than `self` has: the precision of the product is then set by `self` alone
            other = self._exact(other, valuation(other, self.prime) + self.digits + 1)
        self._same_prime(other)
        precision = min(self.valuation + other.precision, other.valuation + self.precision)
        shift = self.valuation + other.valuation
        return PadicNumber.padic(self.prime, self.unit * other.unit, shift, precision)

    __rmul__ = __mul__

    def __pow__(self, exponent: int) -> PadicNumber:
        """The power for exponent >= 1 by products, for exponent 0 the number 1 with `digits` digits."""
        if exponent < 0:
            return self.inverse() ** (-exponent)
        if exponent == 0:
            return PadicNumber.padic(self.prime, 1, 0, max(self.digits, 1))
        result = self
        for bit in bin(exponent)[3:]:
            result = result * result
            if bit == "1":
                result = result * self
        return result

    def inverse(self) -> PadicNumber:
        """The inverse, with as many significant digits.

        Raises `PrecisionLost` for zero to the known precision.
        """
        if self.unit == 0:
            raise PrecisionLost(self.prime, 0, 1, f"inverse of {self}")
        unit = pow(self.unit, -1, self.prime**self.digits)
        return PadicNumber(self.prime, unit, -self.valuation, self.digits - self.valuation)

    def __truediv__(self, other: PadicNumber | int | Fraction) -> PadicNumber:
        if isinstance(other, PadicNumber):
            return self * other.inverse()
        if other == 0:
            raise InternalError("division of a p-adic number by zero")
        return self * (1 / Fraction(other))

    def __rtruediv__(self, other: int | Fraction) -> PadicNumber:
        return self.inverse() * other

    def agrees(self, other: PadicNumber | int | Fraction) -> bool:
        """Whether the two may be the same number, as far as both are known."""
        return (self - other).is_zero

    def rational_reconstruction(self, bound: int | None = None) -> Fraction | None:
        """The small rational number in this ball, or None.

        Arguments: `bound` >= 1 on numerator and denominator of the unit part; absent (or too large for
        uniqueness): the largest B with 2*B^2 < prime^digits, for which at most one such number exists.
        Returns a fraction that agrees with this number to its full precision; zero for O(p^n).

        Source: Wang 1981, the half extended Euclidean algorithm.

        >>> PadicNumber.from_fraction(Fraction(-22, 7), 7, 6).rational_reconstruction()
        Fraction(-22, 7)
        """
        if self.unit == 0:
            return Fraction(0)
        modulus = self.prime**self.digits
        limit = isqrt((modulus - 1) // 2)
        if bound is not None:
            limit = min(limit, bound)
        # invariant: r_i = s_i * unit modulo `modulus`
        r0, r1, s0, s1 = modulus, self.unit, 0, 1
        while r1 > limit:
            quotient = r0 // r1
            r0, r1 = r1, r0 - quotient * r1
            s0, s1 = s1, s0 - quotient * s1
        if s1 == 0 or abs(s1) > limit or r1 == 0 or s1 % self.prime == 0:
            return None
        value = Fraction(r1, s1)
        if max(abs(value.numerator), value.denominator) > limit or value.denominator != abs(s1):
            return None
        return value * Fraction(self.prime) ** self.valuation

    def __str__(self) -> str:
        terms = []
        rest = self.unit
        exponent = self.valuation
        while rest:
            rest, digit = divmod(rest, self.prime)
            if digit:
                power = _power(self.prime, exponent)
                if exponent == 0:
                    terms.append(str(digit))
                else:
                    terms.append(power if digit == 1 else f"{digit}*{power}")
            exponent += 1
        order = "1" if self.precision == 0 else _power(self.prime, self.precision)
        return " + ".join([*terms, f"O({order})"])


def _power(prime: int, exponent: int) -> str:
    return str(prime) if exponent == 1 else f"{prime}^{exponent}"
