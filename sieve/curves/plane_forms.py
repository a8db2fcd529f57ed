"""Forms of any degree on a plane curve over F_v: conditions to vanish, orders at points, whole divisors.

A form H of degree n has n m zeros on X.  Its order at a rational point is read off from a power series
expansion of the curve there; places of higher degree on which it vanishes are recognised among listed ones.
A divisor is used only when the degrees found add up to n m.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import flint
import numpy as np
from numpy.typing import NDArray

from sieve.curves.residue_algebra import ResidueAlgebra
from sieve.curves.residues import power_table

if TYPE_CHECKING:
    from sieve.curves.plane_mod import HigherPlace, ReducedPlane

IntArray = NDArray[np.int64]
Exponents = tuple[int, int, int]


def monomials(degree: int) -> tuple[Exponents, ...]:
    """The exponents (i, j, k) of all monomials X^i Y^j Z^k of a degree, ordered by j, then i.

    >>> monomials(1)
    ((0, 0, 1), (1, 0, 0), (0, 1, 0))
    """
    return tuple((i, j, degree - i - j) for j in range(degree + 1) for i in range(degree + 1 - j))


@dataclass(frozen=True)
class Form:
    """A form of degree `degree`: coefficients in [0, v) at the monomials of `PlaneForms.monomials`."""

    degree: int
    coefficients: tuple[int, ...]


class PlaneForms:
    """The forms on one reduced plane curve, as tables that are made when needed."""

    def __init__(self, curve: ReducedPlane) -> None:
        self.curve = curve
        self.prime = curve.prime
        # no form that is a combination of the monomials not divisible by this one is a multiple of F
        self._leading = max((i, j, k) for i, j, k, _ in curve.terms)
        self._monomials: dict[int, tuple[Exponents, ...]] = {}
        self._values: dict[int, NDArray[np.float64]] = {}
        self._series: dict[tuple[int, int], list[flint.nmod_poly]] = {}
        self._jets: dict[tuple[int, int, int], list[list[int]]] = {}
        self._listed: dict[int, list[HigherPlace]] = {}
        self._place_rows: dict[tuple[int, HigherPlace], list[list[int]]] = {}
        self._place_table: dict[tuple[int, int], IntArray] = {}

    def monomials(self, degree: int) -> tuple[Exponents, ...]:
        """A basis of the forms of a degree modulo multiples of F."""
        if degree not in self._monomials:
            self._monomials[degree] = tuple(
                e for e in monomials(degree) if any(a < b for a, b in zip(e, self._leading, strict=True))
            )
        return self._monomials[degree]

    def rows(self, form: Form) -> tuple[tuple[int, ...], ...]:
        """The coefficients of y^k in H(x, y, 1), low degree first, without zeros at the end."""
        out: list[list[int]] = [[] for _ in range(form.degree + 1)]
        for (i, j, _), c in zip(self.monomials(form.degree), form.coefficients, strict=True):
            if c:
                out[j].extend([0] * (i + 1 - len(out[j])))
                out[j][i] = c
        while not out[-1]:
            out.pop()
        return tuple(tuple(row) for row in out)

    # ---- conditions ----------------------------------------------------------------------------------

    def values(self, degree: int) -> NDArray[np.float64]:
        """The monomials at all points, entries in [0, v); float64, shape (count, number of monomials)."""
        if degree not in self._values:
            v = self.prime
            powers = [power_table(self.curve.coordinates[:, c], degree, v) for c in range(3)]
            columns = [
                powers[0][i] * powers[1][j] % v * powers[2][k] % v for i, j, k in self.monomials(degree)
            ]
            self._values[degree] = np.stack(columns, axis=1).astype(np.float64)
        return self._values[degree]

    def expansion(self, number: int, length: int) -> list[flint.nmod_poly]:
        """X, Y, Z at a point as polynomials in a local parameter, modulo its power `length`."""
        key = number, length
        if key not in self._series:
            self._series[key] = self._expand(self.curve.points[number], length)
        return self._series[key]

    def _expand(self, point: tuple[int, int, int], length: int) -> list[flint.nmod_poly]:
        v = self.prime
        lead = next(k for k in (2, 0, 1) if point[k])
        free = [k for k in range(3) if k != lead]

        def gradient(k: int) -> int:
            total = 0
            for *exponents, c in self.curve.terms:
                term = c * exponents[k]
                for i in range(3):
                    exponent = exponents[i] - (i == k)
                    term = term * pow(point[i], max(exponent, 0), v) % v
                total += term
            return total % v

        slopes = [gradient(k) for k in free]
        if slopes[1] == 0:
            free, slopes = free[::-1], slopes[::-1]
        parameter, other = free
        inverse = -pow(slopes[1], -1, v)
        coordinates = [flint.nmod_poly([c], v) for c in point]
        coordinates[parameter] += flint.nmod_poly([0, 1], v)
        for known in range(1, length):
            # one more coefficient of the other coordinate in every step
            error = self._substitute(coordinates, self.curve.terms, known + 1)
            coordinates[other] += flint.nmod_poly([0] * known + [int(error[known]) * inverse % v], v)
        return coordinates

    def _substitute(
        self, coordinates: Sequence[flint.nmod_poly], terms: Sequence[tuple[int, int, int, int]], length: int
    ) -> flint.nmod_poly:
        v = self.prime
        modulus = flint.nmod_poly([0] * length + [1], v)
        top = max(max(term[:3]) for term in terms)
        powers = []
        for c in coordinates:
            row = [flint.nmod_poly([1], v)]
            for _ in range(top):
                row.append(row[-1] * c % modulus)
            powers.append(row)
        total = flint.nmod_poly([0], v)
        for i, j, k, coefficient in terms:
            total = total + coefficient * (powers[0][i] * powers[1][j] % modulus) * powers[2][k]
        return total % modulus

    def jets(self, degree: int, number: int, length: int) -> list[list[int]]:
        """Row e holds the coefficients of t^e of all monomials at a point; `length` rows."""
        key = degree, number, length
        if key not in self._jets:
            v = self.prime
            coordinates = self.expansion(number, length)
            modulus = flint.nmod_poly([0] * length + [1], v)
            powers = []
            for c in coordinates:
                row = [flint.nmod_poly([1], v)]
                for _ in range(degree):
                    row.append(row[-1] * c % modulus)
                powers.append(row)
            columns = [
                (powers[0][i] * powers[1][j] % modulus) * powers[2][k] % modulus
                for i, j, k in self.monomials(degree)
            ]
            self._jets[key] = [[int(column[e]) for column in columns] for e in range(length)]
        return self._jets[key]

    def through_point(self, degree: int, number: int, multiplicity: int) -> list[list[int]]:
        """The linear conditions for a zero of at least this multiplicity at a point."""
        if multiplicity == 1:
            return [[int(c) for c in self.values(degree)[number]]]
        return self.jets(degree, number, multiplicity)

    def through_subscheme(
        self, degree: int, algebra: ResidueAlgebra, coordinates: Sequence[flint.nmod_poly]
    ) -> list[list[int]]:
        """The linear conditions for H(X, Y, Z) = 0 in F_v[t]/u."""
        powers = []
        for c in coordinates:
            row = [flint.nmod_poly([1], self.prime)]
            for _ in range(degree):
                row.append(row[-1] * c % algebra.u)
            powers.append(row)
        columns = [
            algebra.column(powers[0][i] * powers[1][j] % algebra.u * powers[2][k])
            for i, j, k in self.monomials(degree)
        ]
        return [list(row) for row in zip(*columns, strict=True)]

    def through_place(self, degree: int, place: HigherPlace) -> list[list[int]]:
        """The linear conditions for a zero at a place of higher degree."""
        key = degree, place
        if key not in self._place_rows:
            u, *coordinates = (flint.nmod_poly(list(part), self.prime) for part in place)
            self._place_rows[key] = self.through_subscheme(degree, ResidueAlgebra(u), coordinates)
        return self._place_rows[key]

    def kernel(self, degree: int, conditions: Sequence[Sequence[int]]) -> list[Form]:
        """A basis of the forms that meet linear conditions, of which there is at least one."""
        v, width = self.prime, len(self.monomials(degree))
        matrix = flint.nmod_mat(len(conditions), width, [c for row in conditions for c in row], v)
        basis, nullity = matrix.nullspace()
        columns = range(int(nullity))
        return [Form(degree, tuple(int(basis[i, k]) for i in range(width))) for k in columns]

    def solve(
        self, degree: int, conditions: Sequence[Sequence[int]], rng: np.random.Generator
    ) -> Form | None:
        """A random form that meets linear conditions, or None when only 0 does."""
        v, width = self.prime, len(self.monomials(degree))
        if not conditions:
            coefficients = rng.integers(0, v, width).tolist()
        else:
            basis = self.kernel(degree, conditions)
            if len(basis) < 2:
                return basis[0] if basis else None
            weights = rng.integers(0, v, len(basis)).tolist()
            coefficients = [
                sum(w * form.coefficients[i] for w, form in zip(weights, basis, strict=True)) % v
                for i in range(width)
            ]
        if not any(coefficients):
            return None
        return Form(degree, tuple(coefficients))

    # ---- divisors ------------------------------------------------------------------------------------

    def rational_zeros(self, form: Form) -> list[tuple[int, int]]:
        """Pairs (point number, order) for all rational zeros; exact while v^2 times the monomials < 2^53."""
        v, degree = self.prime, form.degree
        at = self.values(degree) @ np.array(form.coefficients, dtype=np.float64)
        numbers = np.flatnonzero(at.astype(np.int64) % v == 0).tolist()
        if len(numbers) == degree * self.curve.degree:
            return [(i, 1) for i in numbers]
        return [(i, self.order(form, i)) for i in numbers]

    def order(self, form: Form, number: int) -> int:
        """The order of a form that is not a multiple of F at a rational point."""
        length, top = 2, form.degree * self.curve.degree + 1
        while True:
            rows = self.jets(form.degree, number, length)
            for e, row in enumerate(rows):
                if sum(a * b for a, b in zip(row, form.coefficients, strict=True)) % self.prime:
                    return e
            if length == top:
                raise ArithmeticError("a form vanishes on the whole curve")
            length = min(2 * length, top)

    def divisor(
        self, form: Form, degrees: Sequence[int]
    ) -> tuple[list[tuple[int, int]], list[tuple[HigherPlace, int]]] | None:
        """All zeros: rational ones with orders, and places of the listed degrees.

        None where these are not all, or their multiplicities are not clear.
        """
        points = self.rational_zeros(form)
        missing = form.degree * self.curve.degree - sum(order for _, order in points)
        places: list[tuple[HigherPlace, int]] = []
        for e in degrees:
            if missing >= e:
                found = self._listed_zeros(form, e)
                # where 4 zeros are left and one place of degree 2 is found, nothing else can be the rest
                multiplicity = 2 if len(found) == 1 and e == 2 and missing == 4 else 1
                places += [(place, multiplicity) for place in found]
                missing -= e * multiplicity * len(found)
        return (points, places) if missing == 0 else None

    def places_of_degree(self, degree: int) -> list[HigherPlace]:
        """All places of degree 2 or 3, sorted; about v^degree operations: for small v only."""
        if degree not in self._listed:
            self._listed[degree] = sorted(_enumerate_places(self.curve, degree))
        return self._listed[degree]

    def _listed_zeros(self, form: Form, degree: int) -> list[HigherPlace]:
        places = self.places_of_degree(degree)
        if not places:
            return []
        key = form.degree, degree
        if key not in self._place_table:
            rows = [self.through_place(form.degree, place) for place in places]
            self._place_table[key] = np.array(rows, dtype=np.int64)
        value = self._place_table[key] @ np.array(form.coefficients, dtype=np.int64) % self.prime
        return [places[k] for k in np.flatnonzero(~value.any(axis=1)).tolist()]


def _enumerate_places(curve: ReducedPlane, degree: int) -> list[HigherPlace]:
    """Places of prime degree e: x of degree e, then x rational and y of degree e, then Z = 0."""
    v = curve.prime

    def univariate(a: int, z: int) -> flint.nmod_poly:
        coefficients = [0] * (curve.degree + 1)
        for i, j, k, c in curve.terms:
            if z or k == 0:
                coefficients[j] += c * pow(a, i, v)
        return flint.nmod_poly([c % v for c in coefficients], v)

    def irreducible(poly: flint.nmod_poly) -> list[flint.nmod_poly]:
        return [q for q, _ in poly.factor()[1] if q.degree() == degree] if poly.degree() > 0 else []

    found = []
    t = flint.nmod_poly([0, 1], v)
    one, zero = flint.nmod_poly([1], v), flint.nmod_poly([0], v)
    for a in range(v):
        for q in irreducible(univariate(a, 1)):
            found.append(curve.higher_place(q, [flint.nmod_poly([a], v), t, one]))
    for q in irreducible(univariate(1, 0)):
        found.append(curve.higher_place(q, [one, t, zero]))
    for code in range(v**degree):
        u = flint.nmod_poly([*(code // v**i % v for i in range(degree)), 1], v)
        factors = u.factor()[1]
        if len(factors) > 1 or factors[0][1] > 1:
            continue
        for y in _roots_over(curve, u):
            found.append(curve.higher_place(u, [t, y, one]))
    return found


def _roots_over(curve: ReducedPlane, u: flint.nmod_poly) -> list[flint.nmod_poly]:
    """All y in F_v[t]/u with F(t, y, 1) = 0, u irreducible of degree >= 2."""
    v = curve.prime
    modulus = flint.fmpz_mod_poly_ctx(v)([int(a) for a in u.coeffs()])
    field = flint.fq_default_ctx(modulus=modulus)
    coefficients = [flint.nmod_poly([0], v) for _ in range(curve.degree + 1)]
    for i, j, _, c in curve.terms:
        coefficients[j] += flint.nmod_poly([0] * i + [c], v)
    y = flint.fq_default_poly_ctx(field).gen()
    total = 0 * y
    for poly in reversed(coefficients):
        total = total * y + field(flint.fmpz_poly([int(a) for a in (poly % u).coeffs()]))
    if total.degree() < 1:
        return []
    roots = [[int(a) for a in root.to_list()] for root, _ in total.roots()]
    return [flint.nmod_poly(c, v) for c in sorted(roots)]


__all__ = ["Form", "PlaneForms", "monomials"]
