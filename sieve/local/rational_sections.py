"""J(F_v) presented by rational points alone: sections all of whose zeros are F_v-points.

A few points are the base.  Sections with one unknown zero define that point as a combination of the base;
sections without unknown zeros are relations.  Together with 2 P ~ U for every point that is its own conjugate
the relations must span a lattice whose index is the order of the group, so that they are all relations.  The
group is known beforehand; what is found here is evidence for it that can be checked by multiplication.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sieve.curves.divisors import Place
from sieve.curves.protocol import ReducedCurve, Rows
from sieve.errors import InternalError
from sieve.exact.abelian import quotient_by
from sieve.local.peeling import combinations, peel
from sieve.local.picard import PicardGroup

IntArray = NDArray[np.int64]

SMALL_LIMIT = 4000
"""Sections tried at a small prime."""

@dataclass(frozen=True)
class Section:
    """A weighted form H of degree `multiple`, and zeros: point numbers, sorted, with repetition.

    rows[k] holds the coefficients of y^k in H(x, y, 1), low degree first; the class is `multiple` times U.
    """

    multiple: int
    rows: Rows
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
    if curve.plentiful:
        sections = curve.split_sections()
        found = _few_base_points(group) if sections is None else _peeled(group, sections)
    return found or _all_points_as_base(group)


def zeros_of(curve: ReducedCurve, section: Any) -> tuple[int, ...] | None:
    """The zeros of a section as point numbers with repetition, or None if they are not all rational."""
    divisor = curve.section_divisor(section)
    if divisor is None or divisor.places:
        return None
    return tuple(i for i, multiplicity in divisor.points for _ in range(multiplicity))


def section_through(curve: ReducedCurve, place: Place) -> Section | None:
    """A section that vanishes on a closed place over Q; its zeros outside it, those listed, are rational.

    Returns None when no section is found, or the place does not reduce to a closed subscheme.
    """
    found = curve.section_through(place)
    if found is None:
        return None
    section, zeros = found
    return Section(*curve.encode(section), zeros)


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


def _leaders(curve: ReducedCurve) -> list[int]:
    """The first point of every orbit."""
    leaders = [-1] * curve.orbit_count
    for i in range(curve.count):
        if curve.sign[i] == 1:
            leaders[int(curve.orbit[i])] = i
    return leaders


class _Columns:
    """Combinations of (U, base points) for the orbits; the orbit of P0 is 0."""

    def __init__(self, curve: ReducedCurve, origin_orbit: int, base: Sequence[int]) -> None:
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


def _peeled(group: PicardGroup, sections: IntArray) -> Presentation | None:
    """From listed sections with rational zeros alone, where every point is its own orbit."""
    curve = group.curve
    plan = peel(sections, curve.count)
    # the base of the group itself: P0 comes first
    if plan.base[0] != _origin(group):
        return None
    columns = {point: k for k, point in enumerate(plan.base[1:], start=1)}
    width = len(plan.base)
    points = combinations(sections, plan, columns, width, curve.section_units)
    closing: dict[tuple[int, ...], int] = {}
    for number in plan.rest[: 3 * width + 40]:
        row = points[sections[number]].sum(axis=0)
        row[0] -= curve.section_units
        if row.any():
            closing.setdefault(tuple(int(c) for c in row), number)
    rows = list(closing)
    chosen = _choose(group, width, (), rows) if len(rows) >= width else None
    if chosen is None:
        return None
    define = tuple(_section(curve, sections[number]) for number, _ in plan.steps)
    close = tuple(_section(curve, sections[closing[rows[k]]]) for k in chosen)
    for section in (*define, *close):
        _check(group, section.zeros, section.multiple)
    return Presentation(plan.base[0], plan.base[1:], define, close)


def _few_base_points(group: PicardGroup) -> Presentation | None:
    """Large v: sections through distinct points, vectorised."""
    curve = group.curve
    rng = np.random.default_rng([curve.prime, curve.genus, 17])
    leaders, origin = _leaders(curve), _origin(group)
    ramified = set(curve.ramified.tolist())
    affine = [
        o
        for o in rng.permutation(curve.orbit_count).tolist()
        if o not in ramified and leaders[o] < curve.drawn_count and leaders[o] != origin
    ]
    start = int(curve.orbit[origin])
    base = affine[: min(curve.base_size, len(affine))]
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
    columns = _Columns(curve, start, base)
    known = np.zeros(curve.orbit_count, dtype=bool)
    known[[start, *base]] = True
    short = known.copy()
    define: list[Section] = []
    closing: dict[tuple[int, ...], Section] = {}
    stalled = 0
    for attempt in range(40):
        wanted = short if attempt % 2 == 0 or known.all() else known
        pool = np.flatnonzero(wanted[curve.orbit][: curve.drawn_count])
        count = 80 + 2 * curve.batch_size
        choice = pool[rng.integers(0, len(pool), (count, curve.points_per_section))]
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
            columns.define(unknown[0], section.zeros, section.multiple)
            define.append(section)
            known[unknown[0]] = True
        if before == 0 and define:
            short = known.copy()
        if len(closing) < 3 * columns.width + 40:
            inside = short[orbits].all(axis=1) & (missing == 0)
            for k in np.flatnonzero(inside)[: 4 * columns.width + 40].tolist():
                section = _section(curve, divisors[k])
                row = tuple(int(a) for a in columns.total(section.zeros, section.multiple))
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
                    _check(group, section.zeros, section.multiple)
                return Presentation(origin, tuple(leaders[o] for o in base), tuple(define), close)
        if known.all() and attempt > 4:
            # too few relations between the points next to the base: let longer ones in
            short = known.copy()
    return []


def _section(curve: ReducedCurve, zeros: IntArray) -> Section:
    """The section with these zeros, the first of which fix it."""
    numbers = [int(i) for i in zeros]
    return Section(*curve.encode(curve.through(numbers)), tuple(sorted(numbers)))


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
        found = curve.random_section(rng, 0 if attempt < 300 else attempt % 5)
        zeros = zeros_of(curve, found)
        if zeros is not None:
            section = Section(*curve.encode(found), zeros)
            closing.setdefault(tuple(int(a) for a in columns.total(zeros, section.multiple)), section)
        if attempt % 100 or len(closing) + len(free) < columns.width or len(closing) == looked:
            continue
        looked = len(closing)
        rows = list(closing)
        chosen = _choose(group, columns.width, free, rows)
        if chosen is not None:
            close = tuple(closing[rows[k]] for k in chosen)
            for section in close:
                _check(group, section.zeros, section.multiple)
            return Presentation(origin, tuple(leaders[o] for o in base), (), close)
    return None


__all__ = ["Presentation", "Section", "present", "section_through", "zeros_of"]
