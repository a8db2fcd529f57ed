"""The model y^2 + h(x) y = f(x) over the integers, any genus >= 2, both parities of the degree."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from functools import cached_property
from math import lcm

import flint

from sieve.curves.algebras import characteristic_polynomial, express, fractions_of, rational_poly
from sieve.curves.divisors import Divisor, FibrePlace, MumfordPlace, Place, Point, RationalPlace
from sieve.curves.hyperelliptic_mod import ReducedHyperelliptic, smooth_modulo
from sieve.errors import BadReduction

Coefficients = tuple[int, ...]


SMOOTH_BITS = 25
"""Prime factors of discriminants up to this size are looked for in any case."""

HARD_BITS = 160
"""Composite numbers up to this size are factored (a fraction of a second)."""


class SingularCurve(ValueError):
    """The affine equation has a singular point; `factor` is the repeated factor of 4 f + h^2 (text)."""

    def __init__(self, factor: str) -> None:
        self.factor = factor
        super().__init__(f"singular: 4 f + h^2 has the repeated factor {factor}")


def _trim(coefficients: Sequence[int]) -> Coefficients:
    out = [int(c) for c in coefficients]
    while out and out[-1] == 0:
        out.pop()
    return tuple(out)


def _evaluate(coefficients: Sequence[int], x: Fraction) -> Fraction:
    value = Fraction(0)
    for c in reversed(coefficients):
        value = value * x + c
    return value


class HyperellipticCurve:
    """y^2 + h(x) y = f(x) with integer coefficients, smooth, of genus >= 2.

    Arguments: `f`, `h` coefficients low degree first, integers; `y_scale` a nonzero rational: the user's
    y is (model y) / y_scale, so that points can be read and printed in the user's coordinates.
    Raises `SingularCurve` if 4 f + h^2 is not squarefree, `ValueError` if the genus is below 2.

    Coordinates are weighted (X : Y : Z) with weights 1, g+1, 1; at infinity (1 : s : 0) with s^2 + h_{g+1}
    s = f_{2g+2}.

    >>> curve = HyperellipticCurve([1, -2, 1, 2, 2, 4, 1], [])
    >>> curve.genus, curve.contains((1, 1, 0)), curve.contains((0, -1, 1))
    (2, True, True)
    """

    kind = "hyperelliptic"
    variables = ("x", "y", "z")

    def __init__(self, f: Sequence[int], h: Sequence[int] = (), y_scale: Fraction = Fraction(1)) -> None:
        self.f: Coefficients = _trim(f)
        self.h: Coefficients = _trim(h)
        self.y_scale = Fraction(y_scale)
        square = flint.fmpz_poly(list(self.h)) ** 2 + 4 * flint.fmpz_poly(list(self.f))
        degree = max(square.degree(), 0)
        self.genus: int = (degree - 1) // 2
        repeated = square.gcd(square.derivative()) if square.degree() > 0 else square
        if repeated.degree() > 0:
            raise SingularCurve(str(repeated))
        if self.genus < 2:
            raise ValueError(f"genus {max(self.genus, 0)}")
        if len(self.h) > self.genus + 2 or len(self.f) > 2 * self.genus + 3:
            raise ValueError("deg h must be at most g + 1 and deg f at most 2 g + 2")
        self.square_form: Coefficients = tuple(int(c) for c in square.coeffs())
        self.weight: int = self.genus + 1
        self.degree: int = 2 * self.weight
        # F(x, y, 1) = sum of rows[k](x) y^k
        self.rows: tuple[Coefficients, ...] = (tuple(-c for c in self.f), self.h, (1,))

    @staticmethod
    def from_rational(
        f: Sequence[Fraction], h: Sequence[Fraction] = (), y_scale: Fraction = Fraction(1)
    ) -> HyperellipticCurve:
        """The integral model of a curve with rational coefficients: y becomes d y, d as small as possible.

        Arguments: coefficients low degree first of an equation in which the user's y has already been
        multiplied by `y_scale`.  Returns the curve with the total scale recorded in `y_scale`.
        """
        d = lcm(1, *[c.denominator for c in h])
        for c in f:
            rest = (d * d * c).denominator
            if rest > 1:
                for prime, exponent in flint.fmpz(rest).factor():
                    d *= int(prime) ** ((int(exponent) + 1) // 2)
        model_f = [int(d * d * c) for c in f]
        model_h = [int(d * c) for c in h]
        return HyperellipticCurve(model_f, model_h, Fraction(y_scale) * d)

    def __repr__(self) -> str:
        return f"HyperellipticCurve({list(self.f)}, {list(self.h)})"

    # ---- equation ---------------------------------------------------------------------------------

    @property
    def key(self) -> str:
        """A text that determines the model, for stores and digests."""
        return f"hyperelliptic f={','.join(map(str, self.f))} h={','.join(map(str, self.h))}"

    def _form(self, coefficients: Coefficients, degree: int, x: int, z: int) -> int:
        return sum(c * x**i * z ** (degree - i) for i, c in enumerate(coefficients))

    def contains(self, point: Sequence[int]) -> bool:
        """Is (X : Y : Z), integers in weighted coordinates of this model, a point of the curve?"""
        x, y, z = point
        g = self.genus
        if x == 0 and z == 0:
            return False
        return y * y + self._form(self.h, g + 1, x, z) * y == self._form(self.f, 2 * g + 2, x, z)

    def normalise(self, x: Fraction, y: Fraction, z: Fraction) -> Point:
        """The normalised integer coordinates of a rational point of this model (model coordinates).

        Raises `ValueError` when the point is not on the curve or X = Z = 0.
        """
        x, y, z = Fraction(x), Fraction(y), Fraction(z)
        if x == 0 and z == 0:
            raise ValueError("X and Z are both zero")
        scale = 1 / z if z else 1 / x
        x, y, z = x * scale, y * scale ** (self.genus + 1), z * scale
        den = x.denominator if z else 1
        xi, yi, zi = x * den, y * den ** (self.genus + 1), z * den
        if yi.denominator != 1 or not self.contains((int(xi), int(yi), int(zi))):
            raise ValueError("not on the curve")
        return int(xi), int(yi), int(zi)

    def from_user(self, x: Fraction, y: Fraction, z: Fraction = Fraction(1)) -> Point:
        """A point in the user's weighted coordinates as a normalised point of the model."""
        return self.normalise(Fraction(x), Fraction(y) * self.y_scale, Fraction(z))

    def to_user(self, point: Point) -> tuple[Fraction, Fraction, Fraction]:
        """The same point in the user's weighted coordinates."""
        return Fraction(point[0]), Fraction(point[1]) / self.y_scale, Fraction(point[2])

    def format_point(self, point: Point) -> str:
        """The point as interface files write it, `(X : Y : Z)` in the user's coordinates."""
        return "(" + " : ".join(str(c) for c in self.to_user(point)) + ")"

    def involution(self, point: Point) -> Point:
        """The image under the hyperelliptic involution y -> -y - h."""
        x, y, z = point
        return x, -y - self._form(self.h, self.genus + 1, x, z), z

    # ---- places -----------------------------------------------------------------------------------

    def mumford(self, u: Sequence[Fraction], w: Sequence[Fraction]) -> MumfordPlace:
        """The effective divisor u(x) = 0, y = w(x) of this model.

        Raises `ValueError` when u is constant or does not divide w^2 + h w - f.
        """
        up, wp = rational_poly(u), rational_poly(w)
        if up.degree() < 1:
            raise ValueError("u must have degree at least 1")
        up = up / up.coeffs()[-1]
        wp = wp % up
        norm = wp * wp + flint.fmpq_poly(list(self.h)) * wp - flint.fmpq_poly(list(self.f))
        if (norm % up).degree() >= 0:
            raise ValueError("u does not divide w^2 + h w - f")
        return MumfordPlace(fractions_of(up), fractions_of(wp))

    def place_of_point(self, point: Point) -> RationalPlace:
        """The place of a rational point."""
        return RationalPlace(point)

    def closed_point(
        self, modulus: Sequence[Fraction], x: Sequence[Fraction], y: Sequence[Fraction], z: Sequence[Fraction]
    ) -> Place:
        """The divisor of all conjugates of (x(t) : y(t) : z(t)), t a root of `modulus` (model coordinates).

        Raises `ValueError` when the point is not on the curve or when z is a zero divisor but not zero
        modulo `modulus`.
        """
        m, xp, yp, zp = (rational_poly(c) for c in (modulus, x, y, z))
        degree = m.degree()
        if degree < 1:
            raise ValueError("the polynomial must have degree at least 1")
        if m.gcd(m.derivative()).degree() > 0:
            raise ValueError("the polynomial has a repeated root")
        xp, yp, zp = xp % m, yp % m, zp % m
        at_infinity = zp.degree() < 0
        scale_by = xp if at_infinity else zp
        divisor, inverse, _ = scale_by.xgcd(m)
        if divisor.degree() != 0:
            raise ValueError("the coordinates mix points at infinity with others")
        inverse = inverse / divisor
        a = (xp * inverse) % m
        b = (yp * pow(inverse, self.genus + 1)) % m
        f, h = list(self.f), list(self.h)
        if at_infinity:
            lead_f = (f + [0] * (2 * self.genus + 3))[2 * self.genus + 2]
            lead_h = (h + [0] * (self.genus + 2))[self.genus + 1]
            if ((b * b + lead_h * b - lead_f) % m).degree() >= 0:
                raise ValueError("not on the curve")
            if degree % 2:
                raise ValueError("give a rational point at infinity as a point")
            return FibrePlace(degree // 2)

        def at(coefficients: list[int]) -> flint.fmpq_poly:
            value = flint.fmpq_poly([])
            for c in reversed(coefficients):
                value = (value * a + c) % m
            return value

        if ((b * b + at(h) * b - at(f)) % m).degree() >= 0:
            raise ValueError("not on the curve")
        charpoly = characteristic_polynomial(a, m)
        if charpoly.gcd(charpoly.derivative()).degree() == 0:
            return MumfordPlace(fractions_of(charpoly), fractions_of(express(b, a, m)))
        root = charpoly / charpoly.gcd(charpoly.derivative())
        root = root / root.coeffs()[-1]
        if root * root == charpoly:
            return FibrePlace(root.degree())
        raise ValueError("the conjugates do not have distinct x-coordinates: give its parts separately")

    def double_cover_place(self, count: int = 1) -> FibrePlace:
        """The class of `count` fibres of the map to the x-line."""
        return FibrePlace(count)

    # ---- reduction --------------------------------------------------------------------------------

    @cached_property
    def discriminant(self) -> int:
        """The discriminant of 4 f + h^2 as a binary form of degree 2 g + 2."""
        square = flint.fmpz_poly(list(self.square_form))
        value = int(square.discriminant())
        if square.degree() == 2 * self.genus + 1:
            value *= int(square.coeffs()[-1]) ** 2
        return value

    @cached_property
    def _discriminant_factors(self) -> tuple[tuple[int, ...], int]:
        """The primes found in the discriminant, and the part of it that was too hard to factor (1: none)."""
        primes, rest = {2}, 1
        for factor, exponent in flint.fmpz(abs(self.discriminant)).factor_smooth(SMOOTH_BITS):
            if factor.is_probable_prime():
                primes.add(int(factor))
            elif factor.bit_length() <= HARD_BITS:
                primes |= {int(p) for p, _ in factor.factor()}
            else:
                rest *= int(factor) ** int(exponent)
        return tuple(sorted(primes)), rest

    @cached_property
    def bad_primes(self) -> tuple[int, ...]:
        """The primes at which this model is not smooth.

        The effort to find them is bounded: all below 2^25 or so, and all others unless the discriminant
        has a composite factor of more than `HARD_BITS` bits without small ones, see `unfactored`.
        """
        primes, _ = self._discriminant_factors
        return tuple(p for p in primes if not smooth_modulo(self.f, self.h, self.genus, p))

    @property
    def unfactored(self) -> int:
        """A divisor of the discriminant whose prime factors `bad_primes` may lack (1: none)."""
        return self._discriminant_factors[1]

    def is_smooth(self, v: int) -> bool:
        """Is the reduction of this model modulo the prime v smooth?"""
        return smooth_modulo(self.f, self.h, self.genus, v)

    def modulo(self, v: int) -> ReducedHyperelliptic:
        """The reduction modulo the prime v; raises `BadReduction` when it is not smooth."""
        if not self.is_smooth(v):
            raise BadReduction(v, "the model is not smooth there")
        return ReducedHyperelliptic(self.f, self.h, self.genus, v)

    def two_torsion_dimension(self) -> int | None:
        """dim J(Q)[2] over F_2, from the factors of 4 f + h^2, or None where these do not tell.

        J[2] is the group of subsets of even size of the 2 g + 2 branch points modulo complements.  An
        invariant class is an invariant subset, or one that is exchanged with its complement; the latter has
        g + 1 points, so g must be odd and no factor of odd degree may exist (Mumford 1984, chapter IIIa).
        """
        degrees = [int(q.degree()) for q, e in flint.fmpz_poly(list(self.square_form)).factor()[1]]
        if sum(degrees) == 2 * self.genus + 1:
            degrees.append(1)
        odd = any(d % 2 for d in degrees)
        if not odd and self.genus % 2:
            return None
        return len(degrees) - 2 if odd else len(degrees) - 1

    def difference(self, point: Point, base: Divisor) -> Divisor:
        """The divisor deg(B) P - B: P - B for a base divisor of degree 1, 2 P - U for a fibre U."""
        return Divisor.of([(base.degree, RationalPlace(point))]) - base


__all__ = ["Coefficients", "HyperellipticCurve", "SingularCurve"]
