"""Pic of a curve over a small prime field from sections with exact divisors, contact orders included.

The factor base grows as relations come in.  A few rational points are the base; a relation with one unknown
place, of multiplicity 1, defines that place as a combination of the base; a relation without unknown places
closes the lattice; the others wait.  So the matrices stay as small as the base, and places of any degree
may link relations.
"""

from __future__ import annotations

from collections.abc import Hashable, Sequence
from dataclasses import dataclass, field

import numpy as np

from sieve.curves.local_divisors import place_degree
from sieve.curves.protocol import HigherPlace, LocalDivisorLike, ReducedCurve
from sieve.errors import InternalError
from sieve.exact.abelian import FiniteQuotient, quotient_by
from sieve.exact.lattice import hermite

Key = int | HigherPlace
"""A generator of Pic: the number of an orbit of rational points, or a place of higher degree."""

Combination = dict[int, int]
"""An integer combination: column -> coefficient; column 0 is U, column 1 + i the i-th base element."""

PATIENCE = 35
"""Sections without a new definition after which an unknown generator joins the base."""


@dataclass(frozen=True)
class ClosedLattice:
    """The group: `invariants`, `order`, classes `logs` of all places met, `unit` of U; `sections` tried."""

    invariants: tuple[int, ...]
    order: int
    logs: dict[Key, tuple[int, ...]]
    unit: tuple[int, ...]
    sections: int


@dataclass
class _Relation:
    """sum of coefficients times generators + units U = 0."""

    units: int
    terms: dict[Key, int]
    unknown: set[Key] = field(default_factory=set)


class _GrowingBase:
    """Combinations of the base for all known generators, and the relations between base elements."""

    def __init__(self) -> None:
        self.base: list[Key] = []
        self.known: dict[Key, Combination] = {}
        self.waiting: dict[Key, list[_Relation]] = {}
        self.closing: list[Combination] = []
        self.rows: list[tuple[int, ...]] = []
        self.used = 0

    def enlarge(self, key: Key) -> None:
        """Make an unknown generator a base element."""
        self.base.append(key)
        self._learn(key, {len(self.base): 1})

    def add(self, relation: _Relation) -> None:
        """Use a relation now, or when enough of its generators are known."""
        relation.unknown = {key for key in relation.terms if key not in self.known}
        if not self._use(relation):
            for key in relation.unknown:
                self.waiting.setdefault(key, []).append(relation)

    def _learn(self, key: Key, combination: Combination) -> None:
        stack = [(key, combination)]
        while stack:
            key, combination = stack.pop()
            if key in self.known:
                # two relations defined it in one go: their difference closes
                self._close(_plus(combination, self.known[key], -1))
                continue
            self.known[key] = combination
            for relation in self.waiting.pop(key, []):
                relation.unknown.discard(key)
                self._use(relation, stack)

    def _use(self, relation: _Relation, stack: list[tuple[Key, Combination]] | None = None) -> bool:
        """Close or define with a relation; False when it must wait.  Definitions go to a `stack` if given."""
        if len(relation.unknown) > 1:
            return False
        target = next(iter(relation.unknown), None)
        if target is not None and abs(relation.terms[target]) != 1:
            return False
        total: Combination = {0: relation.units}
        for key, coefficient in relation.terms.items():
            if key != target:
                total = _plus(total, self.known[key], coefficient)
        if target is None:
            self._close(total)
            return True
        sign = -relation.terms[target]
        combination = {column: sign * a for column, a in total.items()}
        if stack is None:
            self._learn(target, combination)
        else:
            stack.append((target, combination))
        return True

    def _close(self, combination: Combination) -> None:
        if any(combination.values()):
            self.closing.append(combination)

    def quotient(self) -> FiniteQuotient | None:
        """Z^(columns without P0's) modulo the closing relations so far; P0 is the first base element."""
        n = len(self.base)
        position = [0, -1, *range(1, n)]
        rows = [[*row, *(0,) * (n - len(row))] for row in self.rows]
        for combination in self.closing[self.used :]:
            row = [0] * n
            for column, a in combination.items():
                if column != 1:
                    row[position[column]] = a
            rows.append(row)
        self.used = len(self.closing)
        self.rows = hermite(rows)
        return quotient_by(n, self.rows) if len(self.rows) == n else None


def _plus(a: Combination, b: Combination, factor: int) -> Combination:
    total = dict(a)
    for column, c in b.items():
        total[column] = total.get(column, 0) + factor * c
    return total


def close_lattice(
    curve: ReducedCurve,
    places: Sequence[HigherPlace],
    lower: int,
    exact: bool,
    limit: int,
    spare: int = 0,
) -> ClosedLattice | None:
    """The group generated by all rational points and `places`; None after `limit` sections.

    Arguments: `lower`, a lower bound for #J(F_v) with #J(F_v) < 2 * lower, or, with `exact`, the order
    itself; `spare`, how many of the places may be left out.  Raises `InternalError` if the index contradicts
    the bound.
    """
    v, g = curve.prime, curve.genus
    state = _GrowingBase()
    required: list[Key] = [*range(curve.orbit_count), *places]
    for orbit in required[: g + 3]:
        state.enlarge(orbit)
    for orbit in curve.ramified.tolist():
        state.add(_Relation(-1, {orbit: 2}))
    for place in places:
        if curve.involution and curve.higher_partner(place) == place:
            state.add(_Relation(-place_degree(place), {place: 2}))
    rng = np.random.default_rng([v, g])
    first = min(400, 3 * v ** (g + 2))
    seen: set[Hashable] = set()
    last_gain, tried_with = 0, 0
    unknown = required
    for tries in range(1, limit + 1):
        section = curve.random_section(rng, 0 if tries < first else tries % 5, places)
        divisor = curve.section_divisor(section)
        if divisor is None:
            continue
        relation = _relation(curve, divisor)
        mark = (relation.units, tuple(relation.terms.items()))
        if mark in seen:
            fresh = False
        else:
            fresh = True
            seen.add(mark)
            state.add(relation)
        if unknown:
            left = [key for key in unknown if key not in state.known]
            if len(left) < len(unknown):
                last_gain = tries
            elif tries - last_gain > PATIENCE:
                state.enlarge(left[0])
            # the rational points come first
            enough = len(left) <= spare and not (left and isinstance(left[0], int))
            unknown = [] if enough else left
            continue
        wait = len(state.closing) - tried_with
        if len(state.closing) < len(state.base) or wait < (3 if fresh and tries % 100 else 1):
            continue
        tried_with = len(state.closing)
        group = state.quotient()
        if group is None:
            continue
        if group.order < lower:
            raise InternalError(f"v = {v}: index {group.order} below the bound {lower} for #J")
        if group.order == lower if exact else group.order < 2 * lower:
            return _classes(state, group, tries)
    return None


def _relation(curve: ReducedCurve, divisor: LocalDivisorLike) -> _Relation:
    """(the zeros) - units U = 0, in terms of one place of every pair of conjugates."""
    units = -divisor.units
    terms: dict[Key, int] = {}
    for index, multiplicity in divisor.points:
        orbit = int(curve.orbit[index])
        terms[orbit] = terms.get(orbit, 0) + multiplicity * int(curve.sign[index])
        units += multiplicity * int(curve.fibre[index])
    for place, multiplicity in divisor.places:
        partner = curve.higher_partner(place)
        key = min(place, partner)
        if key == place:
            terms[key] = terms.get(key, 0) + multiplicity
        else:
            terms[key] = terms.get(key, 0) - multiplicity
            units += multiplicity * place_degree(place)
    return _Relation(units, {key: a for key, a in terms.items() if a})


def _classes(state: _GrowingBase, group: FiniteQuotient, sections: int) -> ClosedLattice:
    """The classes of all known generators."""
    moduli = group.invariants
    zero = (0,) * len(moduli)
    columns = [group.coordinates[0], zero, *group.coordinates[1:]]
    logs: dict[Key, tuple[int, ...]] = {}
    for key, combination in state.known.items():
        total = [0] * len(moduli)
        for column, a in combination.items():
            for i, c in enumerate(columns[column]):
                total[i] += a * c
        logs[key] = tuple(t % d for t, d in zip(total, moduli, strict=True))
    return ClosedLattice(moduli, group.order, logs, columns[0], sections)
