"""y^2 + h(x) y = f(x) over a prime field: points, sections y = c(x) and the divisors they cut.

A section of multiple m is a function y - c(x) with deg c <= m and m >= g + 1; its zeros have degree 2 m and
the class m U, where U is the class of a fibre of x.  The norm c^2 + h c - f, read as a form of degree 2 m,
carries the zeros with their multiplicities: at every place above a factor q of the norm at most one of the
two conjugate points is a zero, and the order of y - c there equals the order of q in the norm.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property
from math import factorial

import flint
import numpy as np
from numpy.typing import NDArray

from sieve.curves.divisors import FibrePlace, MumfordPlace, Place, RationalPlace
from sieve.curves.extension_counts import quadratic_count, roots_in_extension
from sieve.curves.local_divisors import LocalDivisor
from sieve.curves.residues import inverse_table
from sieve.errors import BadReduction, InternalError

HigherPlace = tuple[tuple[int, ...], tuple[int, ...]]
"""A place of degree >= 2 over F_v: (u, w), u monic irreducible, y = w(x); low degree first."""

IntArray = NDArray[np.int64]

PLACE_LIMIT = 3000
"""About as many sections at most are tried through a divisor."""


def smooth_modulo(f: Sequence[int], h: Sequence[int], genus: int, v: int) -> bool:
    """Is y^2 + h y = f smooth modulo the prime v, at infinity too (weights 1, g+1, 1)?

    Odd v: 4 f + h^2 as a form of degree 2 g + 2 has no repeated root.  v = 2: a singular point has h = 0 and
    h' y = f', so h and h'^2 f - f'^2 must have no common root, in both charts.
    """

    def poly(c: Sequence[int]) -> flint.nmod_poly:
        return flint.nmod_poly([a % v for a in c], v)

    if v != 2:
        square = poly(
            [int(c) for c in (flint.fmpz_poly(list(h)) ** 2 + 4 * flint.fmpz_poly(list(f))).coeffs()]
        )
        return square.degree() >= 2 * genus + 1 and square.gcd(square.derivative()).degree() == 0
    full_f = list(f) + [0] * (2 * genus + 3 - len(f))
    full_h = list(h) + [0] * (genus + 2 - len(h))
    for chart_f, chart_h in ((full_f, full_h), (full_f[::-1], full_h[::-1])):
        fp, hp = poly(chart_f), poly(chart_h)
        if hp.degree() < 0:
            return False
        if hp.gcd(hp.derivative() ** 2 * fp - fp.derivative() ** 2).degree() > 0:
            return False
    return True


class ReducedHyperelliptic:
    """A smooth curve y^2 + h y = f over F_v with all its F_v-points (v < 2^30).

    Points are numbered: affine ones by x then y, then the points at infinity by s.  `orbit`, `sign`,
    `fibre` give for every point P its class as sign * (class of the orbit's first point) + fibre * U:
    conjugate points share an orbit, since P + (its conjugate) is a fibre.
    """

    unit_degree = 2
    involution = True
    extension_limit = 200_000

    def __init__(self, f: Sequence[int], h: Sequence[int], genus: int, v: int) -> None:
        self.prime = v
        self.genus = genus
        self.section_units = genus + 1
        self.f = [c % v for c in f] + [0] * (2 * genus + 3 - len(f))
        self.h = [c % v for c in h] + [0] * (genus + 2 - len(h))
        self._enumerate()

    # ---- points -----------------------------------------------------------------------------------

    def _evaluate(self, coefficients: Sequence[int], x: IntArray) -> IntArray:
        """Horner modulo v; exact in int64 because v < 2^30."""
        value = np.zeros_like(x)
        for c in reversed(coefficients):
            value = (value * x + c) % self.prime
        return value

    def _enumerate(self) -> None:
        v, g = self.prime, self.genus
        x = np.arange(v, dtype=np.int64)
        fx, hx = self._evaluate(self.f, x), self._evaluate(self.h, x)
        lead_f, lead_h = self.f[2 * g + 2], self.h[g + 1]
        if v == 2:
            pairs = [
                (a, b) for a in range(2) for b in range(2) if (b * b + int(hx[a]) * b - int(fx[a])) % 2 == 0
            ]
            self.x = np.array([a for a, _ in pairs], dtype=np.int64)
            self.y = np.array([b for _, b in pairs], dtype=np.int64)
            infinite = [s for s in range(2) if (s * s + lead_h * s - lead_f) % 2 == 0]
        else:
            root = np.full(v, -1, dtype=np.int64)
            half = np.arange((v + 1) // 2, dtype=np.int64)
            root[half * half % v] = half
            self._root = root
            inverse_two = (v + 1) // 2
            square = root[(hx * hx + 4 * fx) % v]
            has = square >= 0
            xs, r, hs = x[has], square[has], hx[has]
            first = (r - hs) % v * inverse_two % v
            second = (-r - hs) % v * inverse_two % v
            low, high = np.minimum(first, second), np.maximum(first, second)
            both = low != high
            order = np.repeat(np.arange(len(xs)), 1 + both)
            starts = np.cumsum(1 + both) - (1 + both)
            self.x = xs[order]
            self.y = low[order]
            self.y[starts[both] + 1] = high[both]
            r_inf = int(root[(lead_h * lead_h + 4 * lead_f) % v])
            infinite = (
                []
                if r_inf < 0
                else sorted({(r_inf - lead_h) * inverse_two % v, (-r_inf - lead_h) * inverse_two % v})
            )
        self.infinite: list[int] = infinite
        self.affine_count = len(self.x)
        self.count = self.affine_count + len(infinite)
        # start[x] is the number of the first point above x, or -1
        self._start = np.full(v, -1, dtype=np.int64)
        self._start[self.x[::-1]] = np.arange(self.affine_count - 1, -1, -1)
        self._infinite_index = {s: self.affine_count + i for i, s in enumerate(infinite)}
        partner = np.arange(self.count, dtype=np.int64)
        index = np.arange(self.affine_count, dtype=np.int64)
        same_next = np.zeros(self.affine_count, dtype=bool)
        same_next[:-1] = self.x[:-1] == self.x[1:]
        partner[index[same_next]] = index[same_next] + 1
        partner[index[same_next] + 1] = index[same_next]
        if len(infinite) == 2:
            partner[self.affine_count], partner[self.affine_count + 1] = (
                self.affine_count + 1,
                self.affine_count,
            )
        self.partner = partner
        everyone = np.arange(self.count, dtype=np.int64)
        leader = np.minimum(everyone, partner)
        firsts = np.flatnonzero(leader == everyone)
        number = np.full(self.count, -1, dtype=np.int64)
        number[firsts] = np.arange(len(firsts))
        self.orbit: IntArray = number[leader]
        self.sign: IntArray = np.where(leader == everyone, 1, -1).astype(np.int64)
        self.fibre: IntArray = np.where(leader == everyone, 0, 1).astype(np.int64)
        self.orbit_count = len(firsts)
        self.ramified: IntArray = number[np.flatnonzero(partner == everyone)]

    @cached_property
    def points(self) -> list[tuple[int, int, int]]:
        """All F_v-points in weighted coordinates, in the order of their numbers."""
        affine = [(a, b, 1) for a, b in zip(self.x.tolist(), self.y.tolist(), strict=True)]
        return affine + [(1, s, 0) for s in self.infinite]

    def index_of(self, x: int, y: int, z: int) -> int:
        """The number of a point given by integers modulo v in weighted coordinates."""
        v = self.prime
        x, y, z = x % v, y % v, z % v
        if z:
            inverse = pow(z, -1, v)
            x, y = x * inverse % v, y * pow(inverse, self.genus + 1, v) % v
            start = int(self._start[x])
            for i in (start, start + 1):
                if 0 <= i < self.affine_count and int(self.x[i]) == x and int(self.y[i]) == y:
                    return i
        elif x:
            s = y * pow(pow(x, -1, v), self.genus + 1, v) % v
            if s in self._infinite_index:
                return self._infinite_index[s]
        raise InternalError(f"({x} : {y} : {z}) is not a point modulo {v}")

    # ---- sections through given points, vectorised -------------------------------------------------

    @cached_property
    def _inverse(self) -> IntArray:
        return inverse_table(self.prime)

    @property
    def drawn_count(self) -> int:
        """Points with smaller numbers are drawn for sections: the affine ones."""
        return self.affine_count

    @property
    def plentiful(self) -> bool:
        """Are there likely enough sections through distinct points to give the group?"""
        return self.prime >= (30 if self.genus <= 3 else 60)

    @property
    def section_limit(self) -> int:
        """How many sections are tried where exact divisors of sections give the group."""
        return 60_000

    @property
    def base_size(self) -> int:
        """How many orbits are the base of relations."""
        return max(self.genus + 4, int(1.1 * self.orbit_count**0.5) + 2 + 4 * (self.genus - 2))

    @property
    def batch_size(self) -> int:
        """How many rows of points are tried at a time."""
        return 220 + 6 * self.orbit_count if self.genus == 2 else 1500 + 20 * self.orbit_count

    @property
    def points_per_section(self) -> int:
        """How many points fix a section: g + 2."""
        return self.genus + 2

    def usable(self, choice: IntArray) -> NDArray[np.bool_]:
        """Which rows of `choice` (point numbers, shape (T, g+2)) are affine points with distinct x."""
        xs = np.sort(
            np.where(choice < self.affine_count, self.x[np.minimum(choice, self.affine_count - 1)], 0), axis=1
        )
        affine = (choice < self.affine_count).all(axis=1)
        return affine & (xs[:, 1:] != xs[:, :-1]).all(axis=1)

    def residuals(self, choice: IntArray) -> IntArray:
        """The g remaining zeros of the section y = c(x) through given points.

        Arguments: `choice`, int64, shape (T, g+2), point numbers accepted by `usable`; v odd, v < 2^29 / (g
        + 2). Returns int64, shape (T, g): point numbers (repeated when the contact is higher), or -1 all
        along a row whose remaining zeros are not all rational (genus >= 3: not all rational and distinct).
        """
        v, g = self.prime, self.genus
        m = g + 2
        x = self.x[choice].T.copy()
        difference = self.y[choice].T.copy()
        inverse = self._inverse
        # Newton's divided differences
        newton = [difference[0]]
        for level in range(1, m):
            span = inverse[(x[level:] - x[:-level]) % v]
            difference = (difference[1:] - difference[:-1]) * span % v
            newton.append(difference[0])
        c = [newton[m - 1]]
        for k in range(m - 2, -1, -1):
            c = (
                [(newton[k] - c[0] * x[k]) % v]
                + [(c[i - 1] - c[i] * x[k]) % v for i in range(1, len(c))]
                + [c[-1]]
            )
        product = [(-x[0]) % v]
        for k in range(1, m):
            low = (-product[0] * x[k]) % v
            product = (
                [low]
                + [(product[i - 1] - product[i] * x[k]) % v for i in range(1, k)]
                + [(product[k - 1] - x[k]) % v]
            )
        rest: list[IntArray] = [c[0]] * (g + 1)
        for k in range(g, -1, -1):
            i = m + k
            total = np.full_like(c[0], -self.f[i])
            for a in range(max(0, i - g - 1), min(g + 1, i) + 1):
                if 2 * a < i:
                    total += 2 * c[a] * c[i - a]
                elif 2 * a == i:
                    total += c[a] * c[a]
                if self.h[i - a]:
                    total += self.h[i - a] * c[a]
            for j in range(k + 1, g + 1):
                if m + k - j >= 0:
                    total -= rest[j] * product[m + k - j]
            rest[k] = total % v
        return self._split(rest, c)

    def _split(self, rest: list[IntArray], c: list[IntArray]) -> IntArray:
        if self.genus == 2:
            roots, split, infinite = self._quadratic_roots(rest)
        else:
            roots, split, infinite = self._table_roots(rest)
        out = np.full(roots.shape, -1, dtype=np.int64)
        rows = np.flatnonzero(split)
        if not len(rows):
            return out
        xs, at_infinity = roots[rows], infinite[rows]
        ys = np.zeros_like(xs)
        for coefficient in reversed(c):
            ys = (ys * xs + coefficient[rows, None]) % self.prime
        start = self._start[xs]
        index = start + (self.y[np.maximum(start, 0)] != ys)
        if at_infinity.any():
            lookup = np.full(self.prime, -1, dtype=np.int64)
            for s, i in self._infinite_index.items():
                lookup[s] = i
            index = np.where(at_infinity, lookup[c[-1][rows]][:, None], index)
        out[rows] = index
        return out

    def _quadratic_roots(self, rest: list[IntArray]) -> tuple[IntArray, NDArray[np.bool_], NDArray[np.bool_]]:
        v = self.prime
        r0, r1, r2 = rest
        root = self._root[(r1 * r1 - 4 * r0 * r2) % v]
        half = self._inverse[2 * r2 % v]
        roots = np.stack([(root - r1) % v * half % v, (-root - r1) % v * half % v], axis=1)
        split = root >= 0
        infinite = np.zeros(roots.shape, dtype=bool)
        flat = np.flatnonzero(r2 == 0)
        if len(flat):
            infinite[flat, 1] = True
            infinite[flat, 0] = r1[flat] == 0
            roots[flat, 0] = (-r0[flat]) % v * self._inverse[r1[flat]] % v
            roots[flat, 1] = 0
            split[flat] = (r1[flat] != 0) | (r0[flat] != 0)
        roots[~split] = 0
        return roots, split, infinite

    def _table_roots(self, rest: list[IntArray]) -> tuple[IntArray, NDArray[np.bool_], NDArray[np.bool_]]:
        """Distinct roots by evaluation at every x; rows with repeated roots count as not split."""
        v, g = self.prime, self.genus
        count = len(rest[0])
        roots = np.zeros((count, g), dtype=np.int64)
        split = np.zeros(count, dtype=bool)
        infinite = np.zeros((count, g), dtype=bool)
        places = np.arange(v, dtype=np.int64)
        block = max(1, 2_000_000 // v)
        for low in range(0, count, block):
            part = slice(low, min(count, low + block))
            value = np.zeros((part.stop - part.start, v), dtype=np.int64)
            for coefficient in reversed(rest):
                value = (value * places + coefficient[part, None]) % v
            zero = value == 0
            at_infinity = (rest[g][part] == 0).astype(np.int64)
            good = np.flatnonzero(zero.sum(axis=1) + at_infinity == g)
            for wanted in (0, 1):
                rows = good[at_infinity[good] == wanted]
                if len(rows):
                    found = np.nonzero(zero[rows])[1].reshape(len(rows), g - wanted)
                    roots[low + rows, : g - wanted] = found
                    infinite[low + rows, g - wanted :] = True
                    split[low + rows] = True
        return roots, split, infinite

    # ---- exact divisors of single sections ---------------------------------------------------------

    def _poly(self, coefficients: Sequence[int]) -> flint.nmod_poly:
        return flint.nmod_poly([int(c) % self.prime for c in coefficients], self.prime)

    @cached_property
    def _fp(self) -> flint.nmod_poly:
        return self._poly(self.f)

    @cached_property
    def _hp(self) -> flint.nmod_poly:
        return self._poly(self.h)

    def section_divisor(self, section: flint.nmod_poly) -> LocalDivisor:
        """All zeros of y - c(x), with multiplicities; `units` is the m with (zeros) ~ m U."""
        c = section
        m = max(c.degree(), self.genus + 1)
        norm = c * c + self._hp * c - self._fp
        points: list[tuple[int, int]] = []
        places: list[tuple[HigherPlace, int]] = []
        for factor, multiplicity in norm.factor()[1]:
            self._collect(factor, c, int(multiplicity), points, places)
        missing = 2 * m - norm.degree()
        if missing:
            lead = int(c[self.genus + 1]) if m == self.genus + 1 else 0
            points.append((self._infinite_index[lead], missing))
        return LocalDivisor(m, tuple(sorted(points)), tuple(sorted(places)))

    def _collect(
        self,
        factor: flint.nmod_poly,
        w: flint.nmod_poly,
        multiplicity: int,
        points: list[tuple[int, int]],
        places: list[tuple[HigherPlace, int]],
    ) -> None:
        if factor.degree() == 1:
            x = -int(factor[0]) * pow(int(factor[1]), -1, self.prime) % self.prime
            points.append((self.index_of(x, int(w(x)), 1), multiplicity))
        else:
            key = tuple(int(a) for a in factor.coeffs()), tuple(int(a) for a in (w % factor).coeffs())
            places.append((key, multiplicity))

    def higher_partner(self, place: HigherPlace) -> HigherPlace:
        """The conjugate of a place of degree >= 2 under the involution."""
        u = self._poly(place[0])
        return place[0], tuple(int(a) for a in ((-self._poly(place[1]) - self._hp) % u).coeffs())

    def places_of_degree(self, degree: int) -> list[HigherPlace]:
        """All places of the given degree 2 or 3 on which x has full degree, one of each conjugate pair.

        Places of even degree on which x has half the degree are fibres, so they are multiples of U.
        Enumerates v^degree polynomials: for tiny v only.
        """
        v = self.prime
        found = []
        for code in range(v**degree):
            digits, rest = [], code
            for _ in range(degree):
                digits.append(rest % v)
                rest //= v
            u = self._poly([*digits, 1])
            factors = u.factor()[1]
            if len(factors) > 1 or factors[0][1] > 1:
                continue
            for w in self._roots_modulo(u):
                place = tuple(int(a) for a in u.coeffs()), w
                if place <= self.higher_partner(place):
                    found.append(place)
        return found

    def _roots_modulo(self, u: flint.nmod_poly) -> list[tuple[int, ...]]:
        """All w of degree < deg u with w^2 + h w = f modulo the irreducible u."""
        modulus = flint.fmpz_mod_poly_ctx(self.prime)([int(a) for a in u.coeffs()])
        field = flint.fq_default_ctx(modulus=modulus) if u.degree() > 1 else flint.fq_default_ctx(self.prime)

        def element(p: flint.nmod_poly) -> flint.fq_default:
            return field(flint.fmpz_poly([int(a) for a in (p % u).coeffs()]))

        w = flint.fq_default_poly_ctx(field).gen()
        quadratic = w * w + w * element(self._hp) - element(self._fp)
        out = []
        for root, _ in quadratic.roots():
            coefficients = [int(a) for a in root.to_list()]
            while coefficients and coefficients[-1] == 0:
                coefficients.pop()
            out.append(tuple(coefficients))
        return sorted(out)

    def extension_count(self, degree: int) -> int:
        """#X(F_{v^degree}) by enumeration; cost about v^degree operations (v = 2: 4^degree)."""
        if degree == 1:
            return self.count
        v, g = self.prime, self.genus
        infinite = roots_in_extension([-self.f[2 * g + 2], self.h[g + 1], 1], v, degree)
        return quadratic_count(self.f, self.h, v, degree) + infinite

    # ---- divisors over Q ---------------------------------------------------------------------------

    def reduce(self, place: Place) -> LocalDivisor:
        """The reduction of a place over Q; raises `BadReduction` when a denominator vanishes modulo v."""
        v = self.prime
        if isinstance(place, RationalPlace):
            return LocalDivisor(0, ((self.index_of(*place.point), 1),))
        if isinstance(place, FibrePlace):
            return LocalDivisor(place.count, ())
        assert isinstance(place, MumfordPlace)
        if any(c.denominator % v == 0 for c in place.u + place.w):
            raise BadReduction(v, "a denominator of a divisor vanishes there")
        u = self._poly([c.numerator * pow(c.denominator, -1, v) for c in place.u])
        w = self._poly([c.numerator * pow(c.denominator, -1, v) for c in place.w])
        points: list[tuple[int, int]] = []
        places: list[tuple[HigherPlace, int]] = []
        for factor, multiplicity in u.factor()[1]:
            self._collect(factor, w, int(multiplicity), points, places)
        return LocalDivisor(0, tuple(sorted(points)), tuple(sorted(places)))

    def substitute(
        self, place: HigherPlace, rng: np.random.Generator
    ) -> tuple[flint.nmod_poly, LocalDivisor] | None:
        """A section through a place of degree >= 2 and its whole divisor.

        Returns (c, divisor of y - c), the place included in the divisor; None when no suitable points exist.
        """
        u, w = self._poly(place[0]), self._poly(place[1])
        free = self.genus + 2 - u.degree()
        if free <= 0:
            return w, self.section_divisor(w)
        candidates = [i for i in range(self.affine_count) if int(u(int(self.x[i])))]
        chosen: dict[int, int] = {}
        for k in rng.permutation(len(candidates)):
            i = candidates[int(k)]
            chosen.setdefault(int(self.x[i]), int(self.y[i]))
            if len(chosen) == free:
                break
        # where points are scarce, the free coefficients are random instead
        while len(chosen) < free:
            missing = [a for a in range(self.prime) if a not in chosen and int(u(a))]
            if not missing:
                break
            chosen[missing[int(rng.integers(len(missing)))]] = int(rng.integers(self.prime))
        values = [
            (a, (b - int(w(a))) * pow(int(u(a)), -1, self.prime) % self.prime)
            for a, b in sorted(chosen.items())
        ]
        c = w + u * self.interpolate(values)
        return c, self.section_divisor(c)

    def section_through(self, place: Place) -> tuple[flint.nmod_poly, tuple[int, ...]] | None:
        """A section that vanishes on u(x) = 0, y = w(x), and its other zeros, which are rational.

        These are the roots of the norm divided by u (and the point at infinity).  None when no section is
        found, or u or w is not integral at v.
        """
        assert isinstance(place, MumfordPlace)
        v, g = self.prime, self.genus
        if any(a.denominator % v == 0 for a in place.u + place.w):
            return None
        # `free` coefficients are left for points to go through; the other zeros must happen to be rational
        free = g + 2 - place.degree
        chance = factorial(g if free > 0 else place.degree - 1)
        if chance > PLACE_LIMIT // 4:
            return None
        u, w = (
            self._poly([a.numerator * pow(a.denominator, -1, v) for a in part]) for part in (place.u, place.w)
        )
        rng = np.random.default_rng([v, *(int(a) for a in u.coeffs()), 5, *(int(a) for a in w.coeffs())])
        outside = [i for i in range(self.affine_count) if int(u(int(self.x[i])))]
        for attempt in range(200 + 4 * chance):
            size = free + (attempt // 50) % 4 if free > 0 else min(attempt, 1 + attempt % 2)
            c = w + u * self._multiplier(u, w, outside, size, rng)
            norm = c * c + self._hp * c - self._fp
            rest, remainder = divmod(norm, u)
            if remainder.degree() >= 0:
                raise InternalError(f"v = {v}: u does not divide the norm")
            if norm.degree() < 0 or c.degree() < 0:
                continue
            m = max(c.degree(), g + 1)
            factors = rest.factor()[1]
            if any(q.degree() > 1 for q, _ in factors):
                continue
            zeros: list[int] = []
            for q, multiplicity in factors:
                x = -int(q[0]) * pow(int(q[1]), -1, v) % v
                zeros += [self.index_of(x, int(c(x)), 1)] * int(multiplicity)
            missing = 2 * m - norm.degree()
            if missing:
                zeros += [self.index_of(1, int(c[g + 1]) if m == g + 1 else 0, 0)] * missing
            return c, tuple(sorted(zeros))
        return None

    def _multiplier(
        self,
        u: flint.nmod_poly,
        w: flint.nmod_poly,
        outside: list[int],
        size: int,
        rng: np.random.Generator,
    ) -> flint.nmod_poly:
        """A random t with `size` coefficients such that w + u t goes through up to that many points."""
        v = self.prime
        values: dict[int, int] = {}
        picks: list[int] = rng.integers(0, len(outside), 2 * size).tolist() if outside else []
        for k in picks:
            if len(values) == size:
                break
            x, y = int(self.x[outside[k]]), int(self.y[outside[k]])
            values.setdefault(x, (y - int(w(x))) * pow(int(u(x)), -1, v) % v)
        t = self.interpolate(sorted(values.items()))
        if len(values) < size:
            vanishing = self._poly([1])
            for a in values:
                vanishing = vanishing * self._poly([-a, 1])
            t = t + vanishing * self._poly(rng.integers(0, v, size - len(values)).tolist())
        return t

    def split_sections(self) -> None:
        """None: there are far too many sections to list them."""
        return None

    def through(self, points: Sequence[int]) -> flint.nmod_poly:
        """c for the section y = c(x) through the first g + 2 of these points (affine, distinct x)."""
        first = points[: self.genus + 2]
        return self.interpolate([(int(self.x[i]), int(self.y[i])) for i in first])

    def encode(self, section: flint.nmod_poly) -> tuple[int, tuple[tuple[int, ...], ...]]:
        """The multiple of U and the rows of y - c(x), as logs write a section."""
        c = [int(a) for a in section.coeffs()]
        return max(len(c) - 1, self.genus + 1), (tuple(-a % self.prime for a in c), (1,))

    def interpolate(self, values: Sequence[tuple[int, int]]) -> flint.nmod_poly:
        """The polynomial of least degree with given values at distinct places."""
        total, product = self._poly([0]), self._poly([1])
        for a, b in values:
            step = (b - int(total(a))) * pow(int(product(a)), -1, self.prime) % self.prime
            total = total + product * step
            product = product * self._poly([-a, 1])
        return total

    def random_section(
        self, rng: np.random.Generator, extra: int, places: Sequence[HigherPlace] = ()
    ) -> flint.nmod_poly:
        """A random c: of degree <= g + 1 + extra, through a random number of rational points (no places)."""
        v = self.prime
        size = self.genus + 2 + extra
        # many points on it leave few other zeros; all numbers must occur where points are scarce
        through = size if rng.random() < 0.6 else int(rng.integers(0, size + 1))
        values: dict[int, int] = {}
        if self.affine_count:
            for i in rng.permutation(self.affine_count)[:through]:
                values.setdefault(int(self.x[i]), int(self.y[i]))
        c = self.interpolate(sorted(values.items()))
        if len(values) < size:
            vanishing = self._poly([1])
            for a in values:
                vanishing = vanishing * self._poly([-a, 1])
            c = c + vanishing * self._poly([int(a) for a in rng.integers(0, v, size - len(values))])
        return c
