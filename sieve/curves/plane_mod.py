"""A smooth plane curve of degree m over a prime field: points, lines through two of them, places.

A line through P and Q is s P + t Q; the form of degree m that F becomes on it is divisible by s t, and the
other m - 2 zeros are the roots of the quotient.  Its coefficients are values of polars of F, tabulated for all
points.  Forms of higher degree are treated in `plane_forms`.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property
from math import comb

import flint
import numpy as np
from numpy.typing import NDArray

from sieve.curves.divisors import ClosedPlace, FibrePlace, Place, RationalPlace
from sieve.curves.local_divisors import LocalDivisor
from sieve.curves.residue_algebra import ResidueAlgebra
from sieve.curves.residues import inverse_table, power_table, zeros_modulo
from sieve.errors import BadReduction, InternalError

IntArray = NDArray[np.int64]
HigherPlace = tuple[tuple[int, ...], tuple[int, ...], tuple[int, ...], tuple[int, ...]]
"""A place of degree >= 2 over F_v: (u, x, y, z), u irreducible, coordinates modulo u; low degree first."""

BLOCK = 4_000_000
"""Entries of the largest temporary array."""


class ReducedPlane:
    """A smooth curve F = 0 of degree m in the plane over F_v with all its F_v-points (v < 2^20).

    Arguments: `rows`, integers, rows[k] = coefficients of y^k in F(x, y, 1), low degree first; `degree` m.
    Points are numbered: (x, y, 1) by x then y, then (1, s, 0) by s, then (0, 1, 0).  `coordinates`: int64,
    shape (count, 3).
    """

    section_units = 1

    def __init__(self, rows: Sequence[Sequence[int]], degree: int, v: int) -> None:
        self.prime = v
        self.degree = self.unit_degree = degree
        self.genus = (degree - 1) * (degree - 2) // 2
        self.terms: list[tuple[int, int, int, int]] = [
            (i, j, degree - i - j, c % v) for j, row in enumerate(rows) for i, c in enumerate(row) if c % v
        ]
        self._enumerate()
        self.orbit_count = self.count
        self.orbit: IntArray = np.arange(self.count, dtype=np.int64)
        self.sign: IntArray = np.ones(self.count, dtype=np.int64)
        self.fibre: IntArray = np.zeros(self.count, dtype=np.int64)
        self.ramified: IntArray = np.zeros(0, dtype=np.int64)

    # ---- points -----------------------------------------------------------------------------------

    def _enumerate(self) -> None:
        """All points; F(x, y, 1) for all y at once is a product of matrices, exact below 2^53."""
        v, m = self.prime, self.degree
        powers = power_table(np.arange(v, dtype=np.int64), m, v)
        coefficients = np.zeros((m + 1, m + 1), dtype=np.int64)
        for i, j, _, c in self.terms:
            coefficients[j, i] = c
        in_y = (coefficients @ powers % v).astype(np.float64)
        table = powers.astype(np.float64)
        found: list[IntArray] = []
        block = max(1, BLOCK // v)
        for low in range(0, v, block):
            xs, ys = np.nonzero(zeros_modulo(in_y[:, low : low + block].T @ table, v))
            found.append(np.stack([xs + low, ys, np.ones_like(xs)], axis=1))
        infinite = np.zeros(v, dtype=np.int64)
        for _, j, k, c in self.terms:
            if k == 0:
                infinite += c * powers[j]
        s = np.flatnonzero(infinite % v == 0)
        at_infinity = np.stack([np.ones_like(s), s, np.zeros_like(s)], axis=1)
        last = np.array([[0, 1, 0]] if coefficients[m, 0] == 0 else [], dtype=np.int64).reshape(-1, 3)
        self.coordinates: IntArray = np.concatenate([*found, at_infinity, last]).astype(np.int64)
        self.affine_count = sum(len(part) for part in found)
        self.count = len(self.coordinates)
        self._codes = self._code(self.coordinates)

    def _code(self, points: IntArray) -> IntArray:
        """A number for every normalised point, increasing with the numbering; shape (.., 3) to (..)."""
        v = self.prime
        x, y, z = points[..., 0], points[..., 1], points[..., 2]
        return np.asarray(np.where(z == 1, x * v + y, v * v + np.where(x == 1, y, v)), dtype=np.int64)

    @cached_property
    def points(self) -> list[tuple[int, int, int]]:
        """All F_v-points, normalised, in the order of their numbers."""
        return [(a, b, c) for a, b, c in self.coordinates.tolist()]

    @property
    def drawn_count(self) -> int:
        """Points with smaller numbers are drawn for sections: all of them."""
        return self.count

    def numbers(self, points: IntArray) -> IntArray:
        """The numbers of points of the curve given modulo v in any scale; int64, shape (.., 3) to (..)."""
        v = self.prime
        x, y, z = points[..., 0], points[..., 1], points[..., 2]
        lead = np.where(z != 0, z, np.where(x != 0, x, y))
        scaled = points * self._inverse[lead][..., None] % v
        return np.searchsorted(self._codes, self._code(scaled)).astype(np.int64)

    def index_of(self, x: int, y: int, z: int) -> int:
        """The number of a point given by integers modulo v."""
        v = self.prime
        x, y, z = x % v, y % v, z % v
        lead = z or x or y
        if lead:
            inverse = pow(lead, -1, v)
            point = np.array([x * inverse % v, y * inverse % v, z * inverse % v], dtype=np.int64)
            place = int(np.searchsorted(self._codes, self._code(point)))
            if place < self.count and self.coordinates[place].tolist() == point.tolist():
                return place
        raise InternalError(f"({x} : {y} : {z}) is not a point modulo {v}")

    @cached_property
    def _inverse(self) -> IntArray:
        return inverse_table(self.prime)

    # ---- lines through two points, vectorised --------------------------------------------------------

    @property
    def points_per_section(self) -> int:
        """How many points fix a line: 2."""
        return 2

    def usable(self, choice: IntArray) -> NDArray[np.bool_]:
        """Which rows of `choice` (point numbers, shape (T, 2)) are different points."""
        return np.asarray(choice[:, 0] != choice[:, 1])

    @cached_property
    def _polars(self) -> list[tuple[IntArray, IntArray]]:
        """For k = 1 .. m/2: the coefficients of t^k in F(P + t Q) as a form in Q, and its monomials, at all points."""
        v, m = self.prime, self.degree
        powers = [power_table(self.coordinates[:, c], m, v) for c in range(3)]
        out = []
        for k in range(1, m // 2 + 1):
            lower = [(a, b, k - a - b) for a in range(k + 1) for b in range(k + 1 - a)]
            polar = np.zeros((self.count, len(lower)), dtype=np.int64)
            monomial = np.zeros((self.count, len(lower)), dtype=np.int64)
            for column, (a, b, c) in enumerate(lower):
                monomial[:, column] = powers[0][a] * powers[1][b] % v * powers[2][c] % v
                for i, j, n, coefficient in self.terms:
                    factor = coefficient * comb(i, a) * comb(j, b) * comb(n, c) % v
                    if factor:
                        value = powers[0][i - a] * powers[1][j - b] % v * powers[2][n - c] % v
                        polar[:, column] = (polar[:, column] + factor * value) % v
            out.append((polar, monomial))
        return out

    def _line_forms(self, choice: IntArray) -> list[IntArray]:
        """The coefficients of s^{m-2-k} t^k, k = 0 .. m-2, of F(s P + t Q) / (s t)."""
        v, m = self.prime, self.degree
        out: list[IntArray] = []
        for k in range(1, m):
            order = min(k, m - k)
            polar, monomial = self._polars[order - 1]
            at, by = (choice[:, 0], choice[:, 1]) if k == order else (choice[:, 1], choice[:, 0])
            out.append((polar[at] * monomial[by]).sum(axis=1) % v)
        return out

    def residuals(self, choice: IntArray) -> IntArray:
        """The m - 2 remaining zeros of the line through two different points.

        Arguments: `choice`, int64, shape (T, 2), point numbers accepted by `usable`; v odd, v < 2^20.
        Returns int64, shape (T, m - 2): point numbers (repeated when the contact is higher), or -1 all along a
        row whose remaining zeros are not all rational (m >= 5: not all rational and distinct).
        """
        v, m = self.prime, self.degree
        form = self._line_forms(choice)
        s, t, split = self._quadratic_roots(form) if m == 4 else self._table_roots(form)
        out = np.full((len(choice), m - 2), -1, dtype=np.int64)
        rows = np.flatnonzero(split)
        first, second = self.coordinates[choice[rows, 0]], self.coordinates[choice[rows, 1]]
        zeros = (s[rows, :, None] * first[:, None, :] + t[rows, :, None] * second[:, None, :]) % v
        out[rows] = self.numbers(zeros)
        return out

    @cached_property
    def _root(self) -> IntArray:
        """A square root of every residue, or -1."""
        v = self.prime
        table = np.full(v, -1, dtype=np.int64)
        half = np.arange((v + 1) // 2, dtype=np.int64)
        table[half * half % v] = half
        return table

    def _quadratic_roots(self, form: list[IntArray]) -> tuple[IntArray, IntArray, NDArray[np.bool_]]:
        """The roots (s : t) of a s^2 + b s t + c t^2, not all 0; which rows have rational ones."""
        v = self.prime
        a, b, c = form
        root = self._root[(b * b - 4 * a * c) % v]
        # (s : t) = (-b +- root : 2 a), and for a = 0 (1 : 0) and (-c : b)
        s = np.stack([(root - b) % v, (-root - b) % v], axis=1)
        t = np.repeat((2 * a % v)[:, None], 2, axis=1)
        flat = np.flatnonzero(a == 0)
        s[flat, 0], t[flat, 0] = 1, 0
        s[flat, 1], t[flat, 1] = (-c[flat]) % v, b[flat]
        return s, t, root >= 0

    def _table_roots(self, form: list[IntArray]) -> tuple[IntArray, IntArray, NDArray[np.bool_]]:
        """Distinct roots by evaluation at every (1 : t) and (0 : 1); repeated roots count as not split."""
        v, wanted = self.prime, len(form) - 1
        table = power_table(np.arange(v, dtype=np.int64), wanted, v).astype(np.float64)
        stacked = np.stack(form, axis=1).astype(np.float64)
        count = len(stacked)
        s = np.ones((count, wanted), dtype=np.int64)
        t = np.zeros((count, wanted), dtype=np.int64)
        split = np.zeros(count, dtype=bool)
        block = max(1, BLOCK // v)
        for low in range(0, count, block):
            zero = zeros_modulo(stacked[low : low + block] @ table, v)
            last = form[-1][low : low + block] == 0
            good = np.flatnonzero(zero.sum(axis=1) + last == wanted)
            for extra in (0, 1):
                rows = good[last[good] == extra]
                if len(rows):
                    found = np.nonzero(zero[rows])[1].reshape(len(rows), wanted - extra)
                    t[low + rows, : wanted - extra] = found
                    t[low + rows, wanted - extra :] = 1
                    s[low + rows, wanted - extra :] = 0
                    split[low + rows] = True
        return s, t, split

    # ---- divisors over Q ---------------------------------------------------------------------------

    def reduce(self, place: Place) -> LocalDivisor:
        """The reduction of a place over Q; raises `BadReduction` where it does not stay a closed subscheme."""
        v = self.prime
        if isinstance(place, RationalPlace):
            return LocalDivisor(0, ((self.index_of(*place.point), 1),))
        if isinstance(place, FibrePlace):
            return LocalDivisor(place.count, ())
        assert isinstance(place, ClosedPlace)
        algebra, coordinates = self.closed_subscheme(place)
        points: list[tuple[int, int]] = []
        places: list[tuple[HigherPlace, int]] = []
        for factor, multiplicity in algebra.u.factor()[1]:
            at = [c % factor for c in coordinates]
            if factor.degree() == 1:
                x, y, z = (int(c[0]) for c in at)
                points.append((self.index_of(x, y, z), int(multiplicity)))
            else:
                places.append((self.higher_place(factor, at), int(multiplicity)))
        return LocalDivisor(0, tuple(sorted(points)), tuple(sorted(places)))

    def closed_subscheme(self, place: ClosedPlace) -> tuple[ResidueAlgebra, list[flint.nmod_poly]]:
        """F_v[t]/u and the coordinates of a place in it; raises `BadReduction` where it is not embedded."""
        v = self.prime
        if any(c.denominator % v == 0 for part in (place.u, place.x, place.y, place.z) for c in part):
            raise BadReduction(v, "a denominator of a divisor vanishes there")
        u, *coordinates = (
            flint.nmod_poly([c.numerator * pow(c.denominator, -1, v) % v for c in part], v)
            for part in (place.u, place.x, place.y, place.z)
        )
        algebra = ResidueAlgebra(u)
        if algebra.embedding(coordinates) is None:
            raise BadReduction(v, "the points of a divisor fall together there")
        return algebra, coordinates

    def higher_place(self, u: flint.nmod_poly, coordinates: Sequence[flint.nmod_poly]) -> HigherPlace:
        """The key of the place of a point over F_v[t]/u, u irreducible; raises `BadReduction` if it has none."""
        algebra = ResidueAlgebra(u)
        found = algebra.embedding(coordinates)
        if found is None:
            raise BadReduction(self.prime, "a closed point cannot be written there")
        modulus, parts = algebra.in_terms_of(*found)
        x, y, z = parts
        return modulus, x, y, z

    def higher_partner(self, place: HigherPlace) -> HigherPlace:
        """The place itself: there is no involution."""
        return place


__all__ = ["HigherPlace", "ReducedPlane"]
