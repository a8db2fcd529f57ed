"""Residue discs of a weighted plane curve at a prime p of good reduction: centres, parameters, expansions.

The curve is F(X, Y, Z) = 0, weights (1, w, 1), F homogeneous of weighted degree D, `rows[k]` the coefficients
of y^k in F(x, y, 1), low degree first.  The points of X(Q_p) with a given reduction form a disc, and a local
parameter t maps it one-to-one to p Z_p.  Chart coordinates (a, b) are (X, Y) where Z = 1; (Z, Y) where X = 1,
for reductions (1 : s : 0); (X, Z) where Y = 1, for the reduction (0 : 1 : 0) of a plane curve (w = 1).  G(a,
b) is F in the chart.  Where the derivative G_b is a unit, t = a - a0; elsewhere G_a is one (the reduction is
smooth) and t = b - b0; these discs are called ramified: there the map a is.

Centres: the parameter coordinate of the centre is its residue in 0..p-1, except in ramified discs of y^2 + h
y = f for odd p: there the centre is the Weierstrass point.  So the involution maps centres to centres for odd
p, and for p = 2 in discs that are not ramified.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from flint import fmpz_mod_poly

from sieve.errors import InternalError
from sieve.exact.series import coefficients, polynomial

Rows = Sequence[Sequence[int]]


@dataclass(frozen=True)
class Expansion:
    """Coordinates and differentials of a disc as series modulo (p^exponent, t^length).

    `a`, `b`: chart coordinates.  `forms[j]`: the series c(t) with x^i y^k dx / F_y = c(t) dt for the j-th
    pair (i, k) of `differentials`.
    """

    exponent: int
    length: int
    a: fmpz_mod_poly
    b: fmpz_mod_poly
    forms: tuple[fmpz_mod_poly, ...]


def differentials(weight: int, degree: int) -> list[tuple[int, int]]:
    """The pairs (i, k) for which x^i y^k dx / F_y is regular, ordered by k, then i: a basis.

    >>> differentials(3, 6), differentials(1, 4)
    ([(0, 0), (1, 0)], [(0, 0), (1, 0), (0, 1)])
    """
    top = degree - weight - 2
    return [(i, k) for k in range(top // weight + 1) for i in range(top - weight * k + 1)]


def in_chart(rows: Rows, weight: int, degree: int, chart: str) -> list[list[int]]:
    """The rows of a form of weighted degree `degree` in the chart where the coordinate `chart` is 1.

    Returns rows by the power of the second chart coordinate, see the module text.

    >>> in_chart([[5, 0, 7], [1]], 1, 3, "x"), in_chart([[5, 0, 7], [1]], 1, 3, "y")
    ([[0, 7, 0, 5], [0, 0, 1]], [[], [0, 0, 7], [1], [5]])
    """
    if chart == "z":
        return [list(row) for row in rows]
    out: list[list[int]] = []
    for k, row in enumerate(rows):
        for i, c in enumerate(row):
            if c:
                rest = degree - i - weight * k
                first, second = (rest, k) if chart == "x" else (i, rest)
                out += [[] for _ in range(second + 1 - len(out))]
                out[second] += [0] * (first + 1 - len(out[second]))
                out[second][first] = c
    return out


def _transposed(rows: Rows) -> list[list[int]]:
    width = max((len(row) for row in rows), default=0)
    return [[row[i] if i < len(row) else 0 for row in rows] for i in range(width)]


def _value(row: Sequence[int], x: int, modulus: int) -> int:
    value = 0
    for c in reversed(row):
        value = (value * x + c) % modulus
    return value


def value_at(rows: Rows, a: int, b: int, modulus: int) -> int:
    """sum rows[k](a) b^k modulo `modulus`."""
    return _value([_value(row, a, modulus) for row in rows], b, modulus)


def _horner(rows: Sequence[fmpz_mod_poly], u: fmpz_mod_poly, length: int) -> fmpz_mod_poly:
    """sum rows[k] u^k modulo t^length."""
    value = rows[-1].truncate(length)
    for row in rows[-2::-1]:
        product = u * int(value[0]) if value.length() <= 1 else value.mul_low(u, length)
        value = product + row
    return value.truncate(length)


class ResidueDisc:
    """One residue disc.

    Arguments: `rows`, `weight`, `degree` of the model; `prime`, of good reduction; `point`, the reduction in
    weighted coordinates, (x, y, 1), (1, s, 0) or (0, 1, 0), entries in 0..p-1; `number`, its number.

    >>> disc = ResidueDisc([[-1, 0, 0, 0, 0, -1], [], [1]], 3, 6, 7, (0, 6, 1), 0)
    >>> disc.centre(3), disc.ramified, disc.at_infinity
    ((0, 342), False, False)
    """

    def __init__(
        self, rows: Rows, weight: int, degree: int, prime: int, point: tuple[int, int, int], number: int
    ) -> None:
        self.weight, self.degree, self.prime, self.point, self.number = weight, degree, prime, point, number
        self.pairs = differentials(weight, degree)
        self.genus = len(self.pairs)
        self.at_infinity = point[2] == 0
        self.chart = "z" if point[2] else "x" if point[0] else "y"
        self.rows = in_chart(rows, weight, degree, self.chart)
        self.residue = (point[0], point[1]) if self.chart == "z" else (0, point[1] if point[0] else 0)
        a, b = self.residue
        if self.equation(a, b, prime):
            raise InternalError(f"{point} is not a point modulo {prime}")
        slope = [_value(row, a, prime) for row in self.rows]
        self.ramified = _value([k * c for k, c in enumerate(slope)][1:], b, prime) == 0
        # G = sum u^k R_k(s), s the parameter coordinate, u the other: _rows[k] = R_k
        self._rows = _transposed(self.rows) if self.ramified else self.rows
        self._expansions: dict[int, Expansion] = {}

    def equation(self, a: int, b: int, modulus: int) -> int:
        """G(a, b): 0 on the curve."""
        return value_at(self.rows, a, b, modulus)

    def centre(self, exponent: int) -> tuple[int, int]:
        """The chart coordinates (a0, b0) of the centre modulo p^exponent, one point for all exponents."""
        modulus = self.prime**exponent
        a, b = self.residue
        if not self.ramified:
            return a, self._solve(a, b, modulus)
        if self.weight == 1 or self.prime == 2:
            return self._solve(b, a, modulus), b
        # a simple root of the branch polynomial h^2 - 4 (-f)
        low, middle = self.rows[0], self.rows[1]
        square = [-4 * c for c in low] + [0] * (2 * len(middle))
        for i, c in enumerate(middle):
            for j, d in enumerate(middle):
                square[i + j] += c * d
        slope = [k * c for k, c in enumerate(square)][1:]
        for _ in range(exponent.bit_length() + 1):
            a = (a - _value(square, a, modulus) * pow(_value(slope, a, modulus), -1, modulus)) % modulus
        return a, -_value(middle, a, modulus) * pow(2, -1, modulus) % modulus

    def _solve(self, s: int, u: int, modulus: int) -> int:
        """The coordinate u modulo p^n for a parameter coordinate s, from its residue, by Newton's method."""
        row = [_value(part, s, modulus) for part in self._rows]
        slope = [k * c for k, c in enumerate(row)][1:]
        for _ in range(modulus.bit_length().bit_length() + 1):
            u = (u - _value(row, u, modulus) * pow(_value(slope, u, modulus), -1, modulus)) % modulus
        return u

    def coordinates(self, t: int, exponent: int) -> tuple[int, int]:
        """The chart coordinates modulo p^exponent of the point with parameter t, p | t."""
        modulus = self.prime**exponent
        a0, b0 = self.centre(exponent)
        if not self.ramified:
            a = (a0 + t) % modulus
            return a, self._solve(a, b0, modulus)
        b = (b0 + t) % modulus
        return self._solve(b, a0, modulus), b

    def parameter(self, a: int, b: int, exponent: int) -> int:
        """The parameter modulo p^exponent of a point given by its chart coordinates to that precision."""
        a0, b0 = self.centre(exponent)
        return (b - b0 if self.ramified else a - a0) % self.prime**exponent

    def weighted(self, a: int, b: int) -> tuple[int, int, int]:
        """Chart coordinates as weighted coordinates (X : Y : Z)."""
        return (a, b, 1) if self.chart == "z" else (1, b, a) if self.chart == "x" else (a, 1, b)

    def expansion(self, exponent: int, length: int) -> Expansion:
        """The coordinates and differentials modulo (p^exponent, t^length); cached per exponent."""
        known = self._expansions.get(exponent)
        if known is None or known.length < length:
            known = self._expand(exponent, length)
            self._expansions[exponent] = known
        return known

    def _expand(self, exponent: int, length: int) -> Expansion:
        modulus = self.prime**exponent
        a0, b0 = self.centre(exponent)
        s = polynomial([b0 if self.ramified else a0, 1], modulus).truncate(length)
        u = polynomial([a0 if self.ramified else b0], modulus)
        rows = [polynomial(row, modulus).compose(s).truncate(length) for row in self._rows]
        slopes = [k * row for k, row in enumerate(rows)][1:]
        known = 1
        while known < length:
            known = min(2 * known, length)
            inverse = _horner(slopes, u, known).inverse_series_trunc(known)
            u = u - _horner(rows, u, known).mul_low(inverse, known)
        first = _horner(slopes, u, length).inverse_series_trunc(length)
        a, b = (u, s) if self.ramified else (s, u)
        # da / G_b = - db / G_a, and both other charts change the sign
        if self.ramified != (self.chart != "z"):
            first = -first
        return Expansion(exponent, length, a, b, self._forms(first, a, b, length))

    def _forms(
        self, first: fmpz_mod_poly, a: fmpz_mod_poly, b: fmpz_mod_poly, length: int
    ) -> tuple[fmpz_mod_poly, ...]:
        """first * a^e b^k for the exponents that the differentials have in this chart."""
        top = self.degree - self.weight - 2
        known = {(0, 0): first}

        def product(e: int, k: int) -> fmpz_mod_poly:
            if (e, k) not in known:
                smaller, factor = ((e - 1, k), a) if e else ((e, k - 1), b)
                known[e, k] = product(*smaller).mul_low(factor, length)
            return known[e, k]

        out = []
        for i, k in self.pairs:
            rest = top - i - self.weight * k
            powers = {"z": (i, k), "x": (rest, k), "y": (i, rest)}[self.chart]
            out.append(product(*powers))
        return tuple(out)

    def restrict(self, rows: Rows, multiple: int, exponent: int, length: int) -> fmpz_mod_poly:
        """The section of the given multiple of U as a series on this disc modulo (p^exponent, t^length).

        Arguments: rows of a form of weighted degree `multiple`, i + w k <= multiple for every x^i y^k.  The
        value is that of the form where the chart's coordinate is 1.
        """
        modulus = self.prime**exponent
        series = self.expansion(exponent, length)
        chart = in_chart(rows, self.weight, multiple, self.chart)
        a, b = series.a.truncate(length), series.b.truncate(length)
        s, u = (b, a) if self.ramified else (a, b)
        parts = _transposed(chart) if self.ramified else chart
        if not parts:
            return polynomial([], modulus)
        return _horner([polynomial(row, modulus).compose(s).truncate(length) for row in parts], u, length)

    def order(self, rows: Rows, multiple: int, bound: int) -> int:
        """The order of vanishing of a section modulo p at the reduction of the disc, or `bound` if larger."""
        entries = coefficients(self.restrict(rows, multiple, 1, bound), bound)
        return next((k for k, c in enumerate(entries) if c), bound)
