"""Smooth plane curves F(X, Y, Z) = 0 over the integers, of degree 4 and more."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from fractions import Fraction
from functools import cached_property, lru_cache
from itertools import product
from math import gcd, lcm

import flint

from sieve.curves.algebras import characteristic_polynomial, fractions_of, rational_poly
from sieve.curves.divisors import ClosedPlace, Divisor, Place, Point, RationalPlace
from sieve.curves.plane_forms import Exponents, monomials
from sieve.curves.plane_mod import ReducedPlane
from sieve.errors import BadReduction

Rows = tuple[tuple[int, ...], ...]

LARGE_PRIMES = (2147483647, 2147483629, 2147483587)
"""Primes at which smoothness over Q is tried first."""

SMOOTH_BITS = 25
"""Prime factors of the minors up to this size are looked for in any case."""

HARD_BITS = 160
"""Composite numbers up to this size are factored (a fraction of a second)."""

SEARCH = 6
"""Height up to which a rational singular point is looked for, to name it."""


class SingularPlaneCurve(ValueError):
    """The equation has a singular point, over the algebraic closure; `witness` says what is known of it."""

    def __init__(self, witness: str) -> None:
        self.witness = witness
        super().__init__(witness)


@lru_cache(maxsize=16)
def _shifts(form_degree: int, degree: int) -> tuple[dict[Exponents, int], tuple[Exponents, ...]]:
    """Column numbers of the monomials of a degree, and the multipliers that lead from another one to it."""
    return {e: k for k, e in enumerate(monomials(degree))}, monomials(degree - form_degree)


def derivative(terms: Mapping[Exponents, int], variable: int) -> dict[Exponents, int]:
    """The partial derivative of a form, by exponents."""
    out: dict[Exponents, int] = {}
    for exponents, c in terms.items():
        if exponents[variable]:
            lower = list(exponents)
            lower[variable] -= 1
            out[lower[0], lower[1], lower[2]] = c * exponents[variable]
    return out


def macaulay_rows(terms: Mapping[Exponents, int], degree: int) -> list[list[int]]:
    """The multiples of F, F_X, F_Y, F_Z in degree 3 (m - 1) - 2, as rows of coefficients (Macaulay 1902).

    Arguments: the form F by exponents and its degree m >= 2.  The four forms have no common zero over the
    algebraic closure of a field when these rows span all forms of that degree over it; when m is not 0 in the
    field, only then.
    """
    top = 3 * (degree - 1) - 2
    rows = []
    partials = [derivative(terms, k) for k in range(3)]
    for form, form_degree in ((terms, degree), *((p, degree - 1) for p in partials)):
        columns, multipliers = _shifts(form_degree, top)
        for i, j, k in multipliers:
            row = [0] * len(columns)
            for (a, b, c), value in form.items():
                row[columns[a + i, b + j, c + k]] = value
            rows.append(row)
    return rows


def _rank(rows: Sequence[Sequence[int]], v: int) -> int:
    """The rank modulo a prime of any size."""
    entries = [c % v for row in rows for c in row]
    if v < 2**63:
        return int(flint.nmod_mat(len(rows), len(rows[0]), entries, v).rank())
    context = flint.fmpz_mod_ctx(v)
    return int(flint.fmpz_mod_mat(len(rows), len(rows[0]), entries, context).rank())


class PlaneCurve:
    """F(X, Y, Z) = 0 with primitive integer coefficients, smooth, of degree m >= 4 (genus (m-1)(m-2)/2).

    Arguments: `equation`, a mapping from exponents (i, j, k) to integers, or rows: rows[k] holds the
    coefficients of y^k in F(x, y, 1), low degree in x first (then m = max(i + k)); `variables`, the names in
    which the curve is printed.  Raises `SingularPlaneCurve`; `ValueError` when F is not homogeneous of degree
    at least 4.

    Points are primitive (X : Y : Z) with Z > 0, or Z = 0 and X > 0, or (0 : 1 : 0).

    >>> curve = PlaneCurve({(3, 1, 0): 1, (0, 3, 1): 1, (1, 0, 3): 1})
    >>> curve.genus, curve.rows, curve.bad_primes
    (3, ((0, 1), (0, 0, 0, 1), (), (1,)), (7,))
    """

    kind = "plane"
    weight = 1
    y_scale = Fraction(1)
    square_form: tuple[int, ...] = ()

    def __init__(
        self,
        equation: Mapping[Exponents, int] | Sequence[Sequence[int]],
        variables: tuple[str, str, str] = ("x", "y", "z"),
    ) -> None:
        if isinstance(equation, Mapping):
            terms = {(i, j, k): int(c) for (i, j, k), c in equation.items() if c}
        else:
            found = {(i, j): int(c) for j, row in enumerate(equation) for i, c in enumerate(row) if c}
            top = max((i + j for i, j in found), default=0)
            terms = {(i, j, top - i - j): c for (i, j), c in found.items()}
        degrees = {sum(exponents) for exponents in terms}
        if len(degrees) != 1 or min(degrees) < 4:
            raise ValueError("a form of degree at least 4 is needed")
        content = gcd(*terms.values())
        self.terms: dict[Exponents, int] = {e: terms[e] // content for e in sorted(terms)}
        self.degree: int = degrees.pop()
        self.variables = tuple(variables)
        self.genus: int = (self.degree - 1) * (self.degree - 2) // 2
        self.rows: Rows = self._rows()
        self._macaulay = macaulay_rows(self.terms, self.degree)
        width = len(self._macaulay[0])
        if all(_rank(self._macaulay, v) < width for v in LARGE_PRIMES):
            flat = [c for row in self._macaulay for c in row]
            if flint.fmpz_mat(len(self._macaulay), width, flat).rank() < width:
                raise SingularPlaneCurve(self._singular_point())

    def _rows(self) -> Rows:
        rows: list[list[int]] = [[0] * (self.degree + 1 - j) for j in range(self.degree + 1)]
        for (i, j, _), c in self.terms.items():
            rows[j][i] = c
        for row in rows:
            while row and row[-1] == 0:
                row.pop()
        while not rows[-1]:
            rows.pop()
        return tuple(tuple(row) for row in rows)

    def _singular_point(self) -> str:
        partials = [derivative(self.terms, k) for k in range(3)]
        for height in range(1, SEARCH + 1):
            for point in product(range(-height, height + 1), repeat=3):
                if max(map(abs, point)) != height or next(c for c in reversed(point) if c) < 0:
                    continue
                if not any(_value(form, point) for form in (self.terms, *partials)):
                    return f"singular point ({' : '.join(map(str, point))})"
        return "F and its partial derivatives have a common zero"

    def __repr__(self) -> str:
        return f"PlaneCurve({[list(row) for row in self.rows]})"

    # ---- equation ---------------------------------------------------------------------------------

    @property
    def key(self) -> str:
        """A text that determines the model, for stores and digests."""
        return "plane " + " ".join(f"{i},{j},{k}:{c}" for (i, j, k), c in self.terms.items())

    def value(self, point: Sequence[int]) -> int:
        """F(X, Y, Z)."""
        return _value(self.terms, point)

    def contains(self, point: Sequence[int]) -> bool:
        """Is (X : Y : Z), integers, not all 0, a point of the curve?"""
        return any(point) and self.value(point) == 0

    def normalise(self, x: Fraction, y: Fraction, z: Fraction) -> Point:
        """The normalised integer coordinates of a rational point.

        Raises `ValueError` when the point is not on the curve or all coordinates are 0.
        """
        entries = [Fraction(c) for c in (x, y, z)]
        if not any(entries):
            raise ValueError("the coordinates are all zero")
        scale = lcm(*(c.denominator for c in entries))
        integers = [int(c * scale) for c in entries]
        content = gcd(*integers)
        _, second, last = integers
        lead = last or integers[0] or second
        sign = 1 if lead > 0 else -1
        point = (sign * integers[0] // content, sign * second // content, sign * last // content)
        if not self.contains(point):
            raise ValueError("not on the curve")
        return point

    def from_user(self, x: Fraction, y: Fraction, z: Fraction = Fraction(1)) -> Point:
        """A point in the user's coordinates, which are those of the model, normalised."""
        return self.normalise(x, y, z)

    def to_user(self, point: Point) -> tuple[Fraction, Fraction, Fraction]:
        """The same point in the user's coordinates."""
        return Fraction(point[0]), Fraction(point[1]), Fraction(point[2])

    def format_point(self, point: Point) -> str:
        """The point as interface files write it, `(X : Y : Z)`."""
        return "(" + " : ".join(str(c) for c in point) + ")"

    # ---- places -----------------------------------------------------------------------------------

    def place_of_point(self, point: Point) -> RationalPlace:
        """The place of a rational point."""
        return RationalPlace(point)

    def closed_point(
        self, modulus: Sequence[Fraction], x: Sequence[Fraction], y: Sequence[Fraction], z: Sequence[Fraction]
    ) -> Place:
        """The divisor of all conjugates of (x(t) : y(t) : z(t)), t a root of `modulus`.

        Raises `ValueError` when the polynomial has a repeated root, the point is not on the curve, all
        coordinates vanish at a root, or different roots give the same point.
        """
        m = rational_poly(modulus)
        if m.degree() < 1:
            raise ValueError("the polynomial must have degree at least 1")
        if m.gcd(m.derivative()).degree() > 0:
            raise ValueError("the polynomial has a repeated root")
        m = m / m.coeffs()[-1]
        coordinates = [rational_poly(c) % m for c in (x, y, z)]
        common = m
        for coordinate in coordinates:
            common = common.gcd(coordinate)
        if common.degree() > 0:
            raise ValueError("the coordinates are all zero at a root of the polynomial")
        total = rational_poly([])
        for exponents, c in self.terms.items():
            term = rational_poly([c])
            for base, power in zip(coordinates, exponents, strict=True):
                term = term * pow(base, power) % m
            total = total + term
        if (total % m).degree() >= 0:
            raise ValueError("not on the curve")
        if m.degree() == 1:
            xi, yi, zi = (Fraction(0) if c.degree() < 0 else fractions_of(c)[0] for c in coordinates)
            return RationalPlace(self.normalise(xi, yi, zi))
        if not _injective(coordinates, m):
            raise ValueError("different roots of the polynomial give the same point")
        xs, ys, zs = (fractions_of(c) for c in coordinates)
        return ClosedPlace(fractions_of(m), xs, ys, zs)

    def difference(self, point: Point, base: Divisor) -> Divisor:
        """The divisor deg(B) P - B."""
        return Divisor.of([(base.degree, RationalPlace(point))]) - base

    # ---- reduction --------------------------------------------------------------------------------

    @cached_property
    def _minors(self) -> int:
        """A common divisor of maximal minors of the Macaulay rows, combined: all bad primes divide it."""
        rows = self._macaulay
        width, total, state = len(rows[0]), 0, 1
        for _ in range(6):
            square: list[list[int]] = [[0] * width for _ in range(width)]
            for number, row in enumerate(rows):
                # a fixed sequence of small multipliers: every row goes into one or two combinations
                state = state * 1103515245 + 12345 & 0x7FFFFFFF
                targets = [number % width] if number < width else []
                targets.append((state >> 8) % width)
                for target in targets:
                    factor = 1 + (state >> 4) % 3
                    square[target] = [a + factor * b for a, b in zip(square[target], row, strict=True)]
            total = gcd(total, int(flint.fmpz_mat(square).det()))
            if total == 1:
                break
        return total

    @cached_property
    def _bad(self) -> tuple[tuple[int, ...], int]:
        candidates, rest = {2, 3}, 1
        if not self._minors:
            return self._small_bad_primes(), 0
        for factor, exponent in flint.fmpz(self._minors).factor_smooth(SMOOTH_BITS):
            if factor.is_probable_prime():
                candidates.add(int(factor))
            elif factor.bit_length() <= HARD_BITS:
                candidates |= {int(p) for p, _ in factor.factor()}
            else:
                rest *= int(factor) ** int(exponent)
        return tuple(p for p in sorted(candidates) if not self.is_smooth(p)), rest

    def _small_bad_primes(self) -> tuple[int, ...]:
        return tuple(p for p in range(2, 1000) if flint.fmpz(p).is_prime() and not self.is_smooth(p))

    @property
    def bad_primes(self) -> tuple[int, ...]:
        """The primes at which this model is not smooth, found with bounded effort, see `unfactored`."""
        return self._bad[0]

    @property
    def unfactored(self) -> int:
        """A number whose prime factors `bad_primes` may lack (1: none; 0: any prime above 1000).

        Whatever it is, smoothness is tested at every prime that is used.
        """
        return self._bad[1]

    def is_smooth(self, v: int) -> bool:
        """Is the reduction of this model modulo the prime v smooth?"""
        return _rank(self._macaulay, v) == len(self._macaulay[0])

    def modulo(self, v: int) -> ReducedPlane:
        """The reduction modulo the prime v; raises `BadReduction` when it is not smooth."""
        if not self.is_smooth(v):
            raise BadReduction(v, "the model is not smooth there")
        return ReducedPlane(self.rows, self.degree, v)

    def two_torsion_dimension(self) -> int | None:
        """None: the model does not tell dim J(Q)[2]."""
        return None


def _value(terms: Mapping[Exponents, int], point: Sequence[int]) -> int:
    x, y, z = point
    return sum(c * x**i * y**j * z**k for (i, j, k), c in terms.items())


def _ratios(count: int) -> Iterator[tuple[int, int, int]]:
    """Linear forms: enough that one is not 0 at any of `count` points (moment curve)."""
    yield 0, 0, 1
    yield 1, 0, 0
    yield 0, 1, 0
    for s in range(1, 2 * count + 2):
        yield s * s, s, 1


def _injective(coordinates: Sequence[flint.fmpq_poly], m: flint.fmpq_poly) -> bool:
    """Do different roots of the squarefree m give different points?

    Affine coordinates a, b with respect to a linear form that vanishes at none of them; the points differ
    when a + c b has different values at them for one of enough c (every pair excludes one c at most).
    """
    x, y, z = coordinates
    degree = m.degree()
    for p, q, r in _ratios(degree):
        form = p * x + q * y + r * z
        common, inverse, _ = form.xgcd(m)
        if common.degree() == 0:
            break
    inverse = inverse / common
    a, b = (x * inverse % m, y * inverse % m) if r else (y * inverse % m, z * inverse % m)
    if not r and q:
        a = x * inverse % m
    for c in range(degree * (degree - 1) // 2 + 1):
        polynomial = characteristic_polynomial(a + c * b, m)
        if polynomial.gcd(polynomial.derivative()).degree() == 0:
            return True
    return False


__all__ = ["PlaneCurve", "SingularPlaneCurve", "derivative", "macaulay_rows"]
