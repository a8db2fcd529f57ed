"""A smooth plane curve of degree m over a prime field: points, lines through two of them, places.

A line through P and Q is s P + t Q; the form of degree m that F becomes on it is divisible by s t, and the
other m - 2 zeros are the roots of the quotient.  Its coefficients are values of polars of F, tabulated for
all points.  Forms of higher degree are treated in `plane_forms`.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property
from math import comb, factorial, isqrt

import flint
import numpy as np
from numpy.typing import NDArray

from sieve.curves.divisors import ClosedPlace, FibrePlace, Place, RationalPlace
from sieve.curves.extension_counts import plane_count, roots_in_extension
from sieve.curves.local_divisors import LocalDivisor
from sieve.curves.plane_forms import Form, PlaneForms
from sieve.curves.residue_algebra import ResidueAlgebra
from sieve.curves.residues import inverse_table, power_table, zeros_modulo
from sieve.errors import BadReduction, InternalError

IntArray = NDArray[np.int64]
HigherPlace = tuple[tuple[int, ...], tuple[int, ...], tuple[int, ...], tuple[int, ...]]
"""A place of degree >= 2 over F_v: (u, x, y, z), u irreducible, coordinates modulo u; low degree first."""

BLOCK = 4_000_000
"""Entries of the largest temporary array."""

LISTED_UP_TO = 13
"""Up to this v, places of degree 2 are recognised in divisors in any case."""

PLACE_LIMIT = 3000
"""About as many forms at most are tried through a divisor."""


class ReducedPlane:
    """A smooth curve F = 0 of degree m in the plane over F_v with all its F_v-points (v < 2^20).

    Arguments: `rows`, integers, rows[k] = coefficients of y^k in F(x, y, 1), low degree first; `degree` m.
    Points are numbered: (x, y, 1) by x then y, then (1, s, 0) by s, then (0, 1, 0).  `coordinates`: int64,
    shape (count, 3).
    """

    section_units = 1
    involution = False
    extension_limit = 2500

    def __init__(self, rows: Sequence[Sequence[int]], degree: int, v: int) -> None:
        self.prime = v
        self.degree = self.unit_degree = degree
        self.genus = (degree - 1) * (degree - 2) // 2
        self.terms: list[tuple[int, int, int, int]] = [
            (i, j, degree - i - j, c % v) for j, row in enumerate(rows) for i, c in enumerate(row) if c % v
        ]
        self._listed: set[int] = set()
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

    @property
    def plentiful(self) -> bool:
        """Are there likely enough lines that meet the curve in rational points, more than points?

        About N^m / (m! v^(m-2)) of them for N points.
        """
        m, v, count = self.degree, self.prime, self.count
        return v > 30 and 10 * count ** (m - 1) > 13 * factorial(m) * v ** (m - 2)

    @property
    def section_limit(self) -> int:
        """How many forms are tried where exact divisors give the group: in high genus, hardly any split."""
        return 20_000 if self.degree == 4 else 4000 if self.prime <= 7 else 0

    @property
    def base_size(self) -> int:
        """How many points are the base of relations, where lines are not listed."""
        return int(2.2 * self.count**0.5) + 2

    @property
    def batch_size(self) -> int:
        """How many pairs of points are tried at a time."""
        return 1500 + 20 * self.count

    def extension_count(self, degree: int) -> int:
        """#X(F_{v^degree}) by enumeration; cost about v^{2 degree} operations."""
        if degree == 1:
            return self.count
        rows: list[list[int]] = [[0] * (self.degree + 1 - j) for j in range(self.degree + 1)]
        infinite = [0] * (self.degree + 1)
        for i, j, k, c in self.terms:
            rows[j][i] = c
            if k == 0:
                infinite[j] = c
        last = int(infinite[self.degree] == 0)
        affine = plane_count(rows, self.prime, degree)
        return affine + roots_in_extension(infinite, self.prime, degree) + last

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
        """For k = 1 .. m/2, at all points: the coefficient of t^k in F(P + t Q) as a form in Q; monomials."""
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
        Returns int64, shape (T, m - 2): point numbers (repeated when the contact is higher), or -1 all along
        a row whose remaining zeros are not all rational (m >= 5: not all rational and distinct).
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

    def split_sections(self) -> IntArray:
        """Lines that meet the curve in rational points alone.

        m = 4: enough of those with m different points; else all of these, and tangents.  Returns int64, shape
        (L, m), distinct sorted rows.
        """
        if self.degree == 4:
            return self._lines_through_some()
        return np.concatenate([self._lines_by_pairs(), self._tangents()])

    def _lines_through_some(self) -> IntArray:
        """From the remaining zeros of all lines through one of some points; more than points by far."""
        count = self.count
        some = np.random.default_rng([self.prime, 23]).permutation(count)[: 20 + isqrt(count)]
        rank = np.full(count, len(some), dtype=np.int64)
        rank[some] = np.arange(len(some))
        first, second = np.repeat(some, count), np.tile(np.arange(count), len(some))
        once = rank[first] < rank[second]
        choice = np.stack([first[once], second[once]], axis=1).astype(np.int64)
        rest = self.residuals(choice)
        split = rest[:, 0] >= 0
        lines = np.sort(np.concatenate([choice[split], rest[split]], axis=1), axis=1)
        lines = lines[(lines[:, 1:] != lines[:, :-1]).all(axis=1)]
        # two points determine the line
        firsts = np.unique(lines[:, 0] * count + lines[:, 1], return_index=True)[1]
        return lines[firsts]

    def _lines_by_pairs(self) -> IntArray:
        """The lines that join a point to exactly m - 1 others of larger number."""
        m, v, count = self.degree, self.prime, self.count
        found = []
        block = max(1, BLOCK // (4 * count))
        for low in range(0, count, block):
            size = min(block, count - low)
            first, second = np.repeat(np.arange(low, low + size), count), np.tile(np.arange(count), size)
            later = first < second
            first, second = first[later], second[later]
            (a, b, c), (d, e, f) = self.coordinates[first].T, self.coordinates[second].T
            line = np.stack([b * f - c * e, c * d - a * f, a * e - b * d], axis=1) % v
            x, y, z = line.T
            lead = np.where(z != 0, z, np.where(x != 0, x, y))
            codes = self._code(line * self._inverse[lead][:, None] % v) + (first - low) * (v * v + v + 1)
            order = np.argsort(codes, kind="stable")
            codes = codes[order]
            starts = np.flatnonzero(np.diff(codes, prepend=-1))
            others = np.diff(starts, append=len(codes))
            rows = order[starts[others == m - 1][:, None] + np.arange(m - 1)]
            found.append(np.concatenate([first[rows[:, :1]], second[rows]], axis=1))
        return np.concatenate(found).astype(np.int64)

    def _tangents(self) -> IntArray:
        """The tangents that meet the curve in rational points alone, with multiplicities."""
        rows = set()
        for number in range(self.count):
            zeros = self.forms.rational_zeros(self.through([number, number]))
            row = tuple(i for i, order in zeros for _ in range(order))
            if len(row) == self.degree:
                rows.add(row)
        return np.array(sorted(rows), dtype=np.int64).reshape(len(rows), self.degree)

    def through(self, points: Sequence[int]) -> Form:
        """The line through the first two different ones of these points, or the tangent at the only one."""
        other = next((i for i in points if i != points[0]), None)
        if other is None:
            conditions = self.forms.through_point(1, points[0], 2)
            (form,) = self.forms.kernel(1, conditions)
            return form
        (a, b, c), (d, e, f) = self.points[points[0]], self.points[other]
        x, y, z = (b * f - c * e, c * d - a * f, a * e - b * d)
        return Form(1, (z % self.prime, x % self.prime, y % self.prime))

    # ---- forms of any degree -------------------------------------------------------------------------

    @cached_property
    def forms(self) -> PlaneForms:
        """The forms on this curve."""
        return PlaneForms(self)

    def encode(self, section: Form) -> tuple[int, tuple[tuple[int, ...], ...]]:
        """The multiple n of U and the rows of H(x, y, 1), as logs write a section."""
        return section.degree, self.forms.rows(section)

    def random_section(
        self, rng: np.random.Generator, extra: int, places: Sequence[HigherPlace] = ()
    ) -> Form:
        """A random form of degree 1, 2 or 3 or more (`extra` > 0) through random points and places."""
        top = 3 + (extra + 1) // 3
        while True:
            degree = int(rng.integers(1 if extra == 0 else 2, top + 1))
            size = len(self.forms.monomials(degree)) - 1
            through = size if rng.random() < 0.7 else int(rng.integers(0, size + 1))
            wanted: dict[int, int] = {}
            conditions: list[list[int]] = []
            while len(conditions) + sum(wanted.values()) < through:
                if places and (not self.count or rng.random() < 0.3):
                    place = places[int(rng.integers(len(places)))]
                    conditions += self.forms.through_place(degree, place)
                elif self.count:
                    number = int(rng.integers(self.count))
                    wanted[number] = wanted.get(number, 0) + 1
                else:
                    break
            for number, multiplicity in wanted.items():
                conditions += self.forms.through_point(degree, number, multiplicity)
            form = self.forms.solve(degree, conditions, rng)
            if form is not None:
                return form

    def section_divisor(self, section: Form) -> LocalDivisor | None:
        """All zeros of a form, where those of higher degree are recognised; `units` is its degree."""
        degrees = sorted(self._listed | ({2} if self.prime <= LISTED_UP_TO else set()))
        found = self.forms.divisor(section, degrees)
        if found is None:
            return None
        points, places = found
        return LocalDivisor(section.degree, tuple(sorted(points)), tuple(sorted(places)))

    def places_of_degree(self, degree: int) -> list[HigherPlace]:
        """All places of degree 2 or 3; about v^degree operations: for small v only."""
        self._listed.add(degree)
        return self.forms.places_of_degree(degree)

    def substitute(
        self, place: HigherPlace, rng: np.random.Generator
    ) -> tuple[Form, LocalDivisor | None] | None:
        """A form through a place of degree >= 2 and random points; its divisor if the rest is rational."""
        u, *coordinates = (flint.nmod_poly(list(part), self.prime) for part in place)
        found = self._form_through(ResidueAlgebra(u), coordinates, int(rng.integers(3)), rng)
        if found is None:
            return None
        form, zeros = found
        if sum(order for _, order in zeros) + int(u.degree()) != form.degree * self.degree:
            return form, None
        return form, LocalDivisor(form.degree, tuple(zeros), ((place, 1),))

    def section_through(self, place: Place) -> tuple[Form, tuple[int, ...]] | None:
        """A form that vanishes on a closed place over Q, and its other zeros, which are rational.

        Returns the form and point numbers with repetition, sorted; None when none is found or the place does
        not stay a closed subscheme.
        """
        assert isinstance(place, ClosedPlace)
        try:
            algebra, coordinates = self.closed_subscheme(place)
        except BadReduction:
            return None
        own: dict[int, int] = {}
        for factor, multiplicity in algebra.u.factor()[1]:
            if factor.degree() == 1:
                x, y, z = (int((c % factor)[0]) for c in coordinates)
                own[self.index_of(x, y, z)] = int(multiplicity)
        seed = [c for part in (algebra.u, *coordinates) for c in (*map(int, part.coeffs()), 5)]
        rng = np.random.default_rng([self.prime, *seed])
        for attempt in range(200 + min(PLACE_LIMIT, 4 * factorial(min(self.genus, 7)))):
            found = self._form_through(algebra, coordinates, attempt, rng)
            if found is None:
                continue
            form, zeros = found
            rest = [i for i, order in zeros for _ in range(order - own.get(i, 0))]
            if len(rest) + algebra.degree == form.degree * self.degree:
                return form, tuple(sorted(rest))
        return None

    def _form_through(
        self,
        algebra: ResidueAlgebra,
        coordinates: Sequence[flint.nmod_poly],
        attempt: int,
        rng: np.random.Generator,
    ) -> tuple[Form, list[tuple[int, int]]] | None:
        """A form of low degree that vanishes on a subscheme and at random points, and its rational zeros."""
        degree = 1
        while len(self.forms.monomials(degree)) <= algebra.degree:
            degree += 1
        free = len(self.forms.monomials(degree)) - 1 - algebra.degree
        if attempt % 2 or (attempt and not free):
            degree += 1
            free = len(self.forms.monomials(degree)) - 1 - algebra.degree
        conditions = self.forms.through_subscheme(degree, algebra, coordinates)
        for number in rng.permutation(self.count)[:free].tolist():
            conditions += self.forms.through_point(degree, number, 1)
        form = self.forms.solve(degree, conditions, rng)
        return None if form is None else (form, self.forms.rational_zeros(form))

    # ---- divisors over Q ---------------------------------------------------------------------------

    def reduce(self, place: Place) -> LocalDivisor:
        """The reduction of a place over Q; raises `BadReduction` where it is no closed subscheme any more."""
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
            raise BadReduction(v, "a divisor does not stay embedded there")
        return algebra, coordinates

    def higher_place(self, u: flint.nmod_poly, coordinates: Sequence[flint.nmod_poly]) -> HigherPlace:
        """The place of a point over F_v[t]/u, u irreducible; raises `BadReduction` where it has no name."""
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
