"""J(F_v) presented by rational points alone: sections y = c(x) all of whose zeros are F_v-points.

A few points are the base.  Sections with one unknown zero define that point as a combination of the base;
sections without unknown zeros are relations.  Together with 2 P ~ U for every point that is its own conjugate
the relations must span a lattice whose index is the order of the group, so that they are all relations.  The
group is known beforehand; what is found here is evidence for it that can be checked by multiplication.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import factorial

import flint
import numpy as np
from numpy.typing import NDArray

from sieve.curves.divisors import MumfordPlace
from sieve.curves.hyperelliptic_mod import ReducedHyperelliptic
from sieve.errors import InternalError
from sieve.exact.abelian import quotient_by
from sieve.local.picard import FAST_FROM, PicardGroup

IntArray = NDArray[np.int64]

SMALL_LIMIT = 4000
"""Sections tried at a small prime."""

PLACE_LIMIT = 3000
"""About as many sections at most are tried through a divisor."""


@dataclass(frozen=True)
class Section:
    """The section y = c(x), c low degree first, and its zeros: point numbers, sorted, with repetition."""

    c: tuple[int, ...]
    zeros: tuple[int, ...]


@dataclass(frozen=True)
class Presentation:
    """J(F_v) by generators and relations.

    `origin` is the number of P0, whose class is 0; `base` the numbers of the other base points; `define`
    sections, each with exactly one zero (of multiplicity 1) that neither is nor is conjugate to a point known
    before; `close` sections whose zeros are all known.
    """

    origin: int
    base: tuple[int, ...]
    define: tuple[Section, ...]
    close: tuple[Section, ...]


def present(group: PicardGroup) -> Presentation | None:
    """A presentation of the group by sections with rational zeros, or None when none is found.

    Deterministic (seeded by v).  Raises `InternalError` when a section contradicts the logarithms.
    """
    curve = group.curve
    if not group.rational_generation:
        return None
    found = None
    if curve.prime >= FAST_FROM.get(curve.genus, 60):
        found = _few_base_points(group)
    return found or _all_points_as_base(group)


def zeros_of(curve: ReducedHyperelliptic, c: flint.nmod_poly) -> tuple[int, ...] | None:
    """The zeros of y - c(x) as point numbers with repetition, or None if they are not all rational."""
    divisor = curve.section_divisor(c)
    if divisor.places:
        return None
    return tuple(i for i, multiplicity in divisor.points for _ in range(multiplicity))


def section_through(curve: ReducedHyperelliptic, place: MumfordPlace) -> Section | None:
    """A section that vanishes on a divisor over Q and whose other zeros, those listed, are rational.

    The zeros outside the divisor are the roots of the norm divided by u (and the point at infinity).  None
    when no section is found, or u or w is not integral at v.
    """
    v, g = curve.prime, curve.genus
    if any(a.denominator % v == 0 for a in place.u + place.w):
        return None
    # `free` coefficients are left for points to go through; the other zeros must happen to be rational
    free = g + 2 - place.degree
    chance = factorial(g if free > 0 else place.degree - 1)
    if chance > PLACE_LIMIT // 4:
        return None
    u, w = (_poly([a.numerator * pow(a.denominator, -1, v) for a in part], v) for part in (place.u, place.w))
    f, h = _poly(curve.f, v), _poly(curve.h, v)
    rng = np.random.default_rng([v, *(int(a) for a in u.coeffs()), 5, *(int(a) for a in w.coeffs())])
    outside = [i for i in range(curve.affine_count) if int(u(int(curve.x[i])))]
    for attempt in range(200 + 4 * chance):
        size = free + (attempt // 50) % 4 if free > 0 else min(attempt, 1 + attempt % 2)
        c = w + u * _multiplier(curve, u, w, outside, size, rng)
        norm = c * c + h * c - f
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
            zeros += [curve.index_of(x, int(c(x)), 1)] * int(multiplicity)
        missing = 2 * m - norm.degree()
        if missing:
            zeros += [curve.index_of(1, int(c[g + 1]) if m == g + 1 else 0, 0)] * missing
        return Section(tuple(int(a) for a in c.coeffs()), tuple(sorted(zeros)))
    return None


def _poly(values: Sequence[int], v: int) -> flint.nmod_poly:
    return flint.nmod_poly([int(a) % v for a in values], v)


def _multiplier(
    curve: ReducedHyperelliptic,
    u: flint.nmod_poly,
    w: flint.nmod_poly,
    outside: list[int],
    size: int,
    rng: np.random.Generator,
) -> flint.nmod_poly:
    """A random t with `size` coefficients such that w + u t goes through up to that many rational points."""
    v = curve.prime
    values: dict[int, int] = {}
    picks: list[int] = rng.integers(0, len(outside), 2 * size).tolist() if outside else []
    for k in picks:
        if len(values) == size:
            break
        x, y = int(curve.x[outside[k]]), int(curve.y[outside[k]])
        values.setdefault(x, (y - int(w(x))) * pow(int(u(x)), -1, v) % v)
    t = curve.interpolate(sorted(values.items()))
    if len(values) < size:
        vanishing = _poly([1], v)
        for a in values:
            vanishing = vanishing * _poly([-a, 1], v)
        t = t + vanishing * _poly(rng.integers(0, v, size - len(values)).tolist(), v)
    return t


# ---- the lattice ---------------------------------------------------------------------------------------


def _origin(group: PicardGroup) -> int:
    """The number of P0: the one point with class 0."""
    zero = np.flatnonzero(~group.point_logs.any(axis=1))
    return int(zero[0])


def _check(group: PicardGroup, zeros: Sequence[int], units: int) -> None:
    total = [0] * len(group.invariants)
    for i in zeros:
        group.add(total, 1, group.point_logs[i])
    group.add(total, -units, group.unit_log)
    if any(total):
        raise InternalError(f"v = {group.prime}: a section contradicts the logarithms")


def _units(curve: ReducedHyperelliptic, c: Sequence[int]) -> int:
    return max(len(c) - 1, curve.genus + 1)


def _leaders(curve: ReducedHyperelliptic) -> list[int]:
    """The first point of every orbit."""
    leaders = [-1] * curve.orbit_count
    for i in range(curve.count):
        if curve.sign[i] == 1:
            leaders[int(curve.orbit[i])] = i
    return leaders


class _Columns:
    """Combinations of (U, base points) for the orbits; the orbit of P0 is 0."""

    def __init__(self, curve: ReducedHyperelliptic, origin_orbit: int, base: Sequence[int]) -> None:
        self.curve = curve
        self.width = 1 + len(base)
        self.rows: dict[int, IntArray] = {origin_orbit: np.zeros(self.width, dtype=np.int64)}
        for k, orbit in enumerate(base, start=1):
            row = np.zeros(self.width, dtype=np.int64)
            row[k] = 1
            self.rows[orbit] = row

    def total(self, zeros: Sequence[int], units: int, skip: int = -1) -> IntArray:
        """sum of the known zeros - units U; the orbit `skip` is left out."""
        out = np.zeros(self.width, dtype=np.int64)
        out[0] = -units
        for i in zeros:
            orbit = int(self.curve.orbit[i])
            if orbit != skip:
                out += int(self.curve.sign[i]) * self.rows[orbit]
            out[0] += int(self.curve.fibre[i])
        return out

    def define(self, orbit: int, zeros: Sequence[int], units: int) -> None:
        """Solve a section for its one unknown zero."""
        target = next(i for i in zeros if int(self.curve.orbit[i]) == orbit)
        self.rows[orbit] = -int(self.curve.sign[target]) * self.total(zeros, units, orbit)

    def ramified(self) -> list[tuple[int, ...]]:
        """The relations 2 P ~ U."""
        out = []
        for orbit in self.curve.ramified.tolist():
            row = 2 * self.rows[orbit]
            row[0] -= 1
            out.append(tuple(int(a) for a in row))
        return out


def _choose(
    group: PicardGroup, width: int, free: Sequence[tuple[int, ...]], rows: Sequence[tuple[int, ...]]
) -> list[int] | None:
    """Indices of few rows that, with the free ones, span the lattice of index #J; None if all do not."""
    order = sorted(range(len(rows)), key=lambda k: (sum(map(abs, rows[k])), rows[k]))
    take = max(0, width - len(free))
    while True:
        part = order[:take]
        quotient = quotient_by(width, [*free, *[rows[k] for k in part]])
        if quotient is not None and quotient.order == group.order:
            return sorted(part)
        if take >= len(rows):
            return None
        take += max(2, take // 8)


def _few_base_points(group: PicardGroup) -> Presentation | None:
    """Large v: sections through distinct points, vectorised."""
    curve = group.curve
    v, g = curve.prime, curve.genus
    rng = np.random.default_rng([v, g, 17])
    leaders, origin = _leaders(curve), _origin(group)
    ramified = set(curve.ramified.tolist())
    affine = [
        o
        for o in rng.permutation(curve.orbit_count).tolist()
        if o not in ramified and leaders[o] < curve.affine_count and leaders[o] != origin
    ]
    start = int(curve.orbit[origin])
    size = max(g + 4, int(1.1 * curve.orbit_count**0.5) + 2 + 4 * (g - 2))
    base = affine[: min(size, len(affine))]
    for _ in range(6):
        found = _from_base(group, rng, origin, start, base, leaders)
        if isinstance(found, Presentation):
            return found
        base = [*base, *found]
    return None


def _from_base(
    group: PicardGroup, rng: np.random.Generator, origin: int, start: int, base: list[int], leaders: list[int]
) -> Presentation | list[int]:
    """A presentation on this base, or the orbits to add to it."""
    curve = group.curve
    g = curve.genus
    columns = _Columns(curve, start, base)
    known = np.zeros(curve.orbit_count, dtype=bool)
    known[[start, *base]] = True
    short = known.copy()
    define: list[Section] = []
    closing: dict[tuple[int, ...], Section] = {}
    stalled = 0
    for attempt in range(40):
        wanted = short if attempt % 2 == 0 or known.all() else known
        pool = np.flatnonzero(wanted[curve.orbit][: curve.affine_count])
        count = (300 if g == 2 else 1500) + (20 if g == 2 else 40) * curve.orbit_count
        choice = pool[rng.integers(0, len(pool), (count, g + 2))]
        choice = choice[curve.usable(choice)]
        rest = curve.residuals(choice)
        divisors = np.concatenate([choice, rest], axis=1)[rest[:, 0] >= 0]
        orbits = curve.orbit[divisors]
        missing = (~known[orbits]).sum(axis=1)
        before = len(define)
        for k in np.flatnonzero(missing == 1).tolist():
            unknown = [int(o) for o in orbits[k] if not known[o]]
            if len(unknown) != 1:
                continue  # defined by an earlier row of this batch
            # within a batch only what was known before it counts, so that chains stay short
            section = _section(curve, divisors[k])
            columns.define(unknown[0], section.zeros, _units(curve, section.c))
            define.append(section)
            known[unknown[0]] = True
        if before == 0 and define:
            short = known.copy()
        if len(closing) < 3 * columns.width + 40:
            inside = short[orbits].all(axis=1) & (missing == 0)
            for k in np.flatnonzero(inside)[: 4 * columns.width + 40].tolist():
                section = _section(curve, divisors[k])
                row = tuple(int(a) for a in columns.total(section.zeros, _units(curve, section.c)))
                if any(row):
                    closing.setdefault(row, section)
        stalled = stalled + 1 if len(define) == before and not known.all() else 0
        if stalled > 4:
            return [int(np.flatnonzero(~known)[0])]
        if known.all() and len(closing) >= columns.width - len(curve.ramified):
            rows = list(closing)
            chosen = _choose(group, columns.width, columns.ramified(), rows)
            if chosen is not None:
                close = tuple(closing[rows[k]] for k in chosen)
                for section in [*define, *close]:
                    _check(group, section.zeros, _units(curve, section.c))
                return Presentation(origin, tuple(leaders[o] for o in base), tuple(define), close)
            if attempt > 6:
                short = known.copy()
    return []


def _section(curve: ReducedHyperelliptic, zeros: IntArray) -> Section:
    """The section with these zeros, the first g + 2 of which are affine with distinct x."""
    through = zeros[: curve.genus + 2].tolist()
    c = curve.interpolate([(int(curve.x[i]), int(curve.y[i])) for i in through])
    return Section(tuple(int(a) for a in c.coeffs()), tuple(sorted(int(i) for i in zeros)))


def _all_points_as_base(group: PicardGroup) -> Presentation | None:
    """Small v: every point is in the base; sections of several degrees, with contact orders."""
    curve = group.curve
    leaders, origin = _leaders(curve), _origin(group)
    start = int(curve.orbit[origin])
    base = [o for o in range(curve.orbit_count) if o != start]
    columns = _Columns(curve, start, base)
    free = columns.ramified()
    rng = np.random.default_rng([curve.prime, curve.genus, 19])
    closing: dict[tuple[int, ...], Section] = {}
    looked = -1
    for attempt in range(1, SMALL_LIMIT + 1):
        c = curve.random_section(rng, extra=0 if attempt < 300 else attempt % 5)
        zeros = zeros_of(curve, c)
        if zeros is not None and c.degree() >= 0:
            section = Section(tuple(int(a) for a in c.coeffs()), zeros)
            closing.setdefault(tuple(int(a) for a in columns.total(zeros, _units(curve, section.c))), section)
        if attempt % 100 or len(closing) + len(free) < columns.width or len(closing) == looked:
            continue
        looked = len(closing)
        rows = list(closing)
        chosen = _choose(group, columns.width, free, rows)
        if chosen is not None:
            close = tuple(closing[rows[k]] for k in chosen)
            for section in close:
                _check(group, section.zeros, _units(curve, section.c))
            return Presentation(origin, tuple(leaders[o] for o in base), (), close)
    return None


__all__ = ["Presentation", "Section", "present", "section_through", "zeros_of"]
