"""Effective relations between F_p-points: which divisors on them are zeros of sections.

The vectors n with sum n_i P_i ~ k U form a lattice.  Every vector becomes effective when vectors of sections
of multiple 1 (lines, fibres of x) that vanish on rational points alone are added; where a point lies on none
of them, a lattice vector near a multiple of (1, .., 1) serves instead.  So effective vectors span the
lattice. Points of an orbit of the curve's involution are related by fibres, and only the first of each enters
the lattice that has to be reduced.
"""

from __future__ import annotations

from collections.abc import Collection, Sequence

import numpy as np

from sieve.curves.discs import ResidueDisc
from sieve.errors import Uncertified
from sieve.exact.lattice import ReducedLattice
from sieve.local.picard import PicardGroup
from sieve.local.supported_sections import Model, relation_lattice

Vector = tuple[int, ...]

ROUND_LIMIT = 60
"""The largest multiple of (1, .., 1) near which a positive relation is looked for."""


def unit_vectors(discs: Sequence[ResidueDisc], model: Model) -> list[Vector]:
    """The zeros of all sections of multiple 1 that vanish on rational points alone, sorted.

    A vector has the order of vanishing at every disc.
    """
    p, count = discs[0].prime, len(discs)
    points = np.array([disc.point for disc in discs], dtype=np.int64).reshape(count, 3)
    width = 3 if model.weight == 1 else 2
    if width == 2:
        points = points[:, [0, 2]]
    forms = [(1, *rest) for rest in np.ndindex(*(p,) * (width - 1))]
    forms += [(0, 1, *rest) for rest in np.ndindex(*(p,) * (width - 2))]
    forms += [(0, 0, 1)] * (width == 3)
    incidence = points @ np.array(forms, dtype=np.int64).T % p == 0
    out: set[Vector] = set()
    for form, column in zip(forms, incidence.T, strict=True):
        on = [int(i) for i in np.flatnonzero(column)]
        if not on:
            continue
        vector = [0] * count
        if len(on) == model.unit_degree:
            orders = [1] * len(on)
        else:
            x, y, z = form if width == 3 else (form[0], 0, form[1])
            rows = [[z, x], [y]]
            orders = [discs[i].order(rows, 1, model.unit_degree + 1) for i in on]
        if sum(orders) == model.unit_degree:
            for i, n in zip(on, orders, strict=True):
                vector[i] = n
            out.add(tuple(vector))
    return sorted(out, reverse=True)


class EffectiveRelations:
    """Relations between the points outside `avoid`, as vectors over all discs.

    `heads`: the first point of each orbit; `lattice`: the relations between them; `units`: see
    `unit_vectors`.
    """

    def __init__(
        self, discs: Sequence[ResidueDisc], model: Model, group: PicardGroup,
        units: Sequence[Vector], avoid: Collection[int] = (),
    ) -> None:
        self.discs, self.model, self.group, self.count = discs, model, group, len(discs)
        orbit = [int(i) for i in group.curve.orbit]
        first: dict[int, int] = {}
        for i in range(self.count):
            if i not in avoid:
                first.setdefault(orbit[i], i)
        self.heads = sorted(first.values())
        self.units = [u for u in units if not any(u[i] for i in avoid)]
        self.relations = relation_lattice(group, self.heads)
        self.lattice = ReducedLattice(self.relations)
        self._avoid = frozenset(avoid)
        self._positive: Vector | None = None

    def fold(self, vector: Sequence[int]) -> Vector:
        """The vector modulo fibres, over the heads: a conjugate point counts as minus its head."""
        curve, place = self.group.curve, {int(self.group.curve.orbit[i]): k for k, i in enumerate(self.heads)}
        out = [0] * len(self.heads)
        for i, n in enumerate(vector):
            if n:
                head = place[int(curve.orbit[i])]
                same = i == self.heads[head]
                out[head] += n if same else -n
        return tuple(out)

    @property
    def positive(self) -> Vector:
        """A short relation with positive entries everywhere (over the heads)."""
        if self._positive is None:
            for size in range(1, ROUND_LIMIT):
                target = [size] * len(self.heads)
                rest = self.lattice.reduce(target)
                found = [a - b for a, b in zip(target, rest, strict=True)]
                if all(c > 0 for c in found):
                    self._positive = self._spread(found)
                    break
            else:
                raise Uncertified(self.group.prime, "no effective relation between the points was found")
        return self._positive

    def _spread(self, vector: Sequence[int]) -> Vector:
        out = [0] * self.count
        for i, n in zip(self.heads, vector, strict=True):
            out[i] = int(n)
        return tuple(out)

    def effective(self, vector: Sequence[int], least: int = 0) -> Vector:
        """An effective relation, over all discs, that differs from a vector over the heads by known ones.

        Known ones: `units` and, where these do not suffice, `positive`.  The vector may be that of a class
        that is no relation.  `least`: the least degree wanted.
        """
        total = list(self._spread(vector))
        for i in range(self.count):
            if total[i] >= 0:
                continue
            options = [u for u in self.units if u[i]]
            if options:
                while total[i] < 0:
                    best = max((_gain(u, total), u) for u in options)[1]
                    total = [a + b for a, b in zip(total, best, strict=True)]
            else:
                times = -(total[i] // self.positive[i])
                total = [a + times * b for a, b in zip(total, self.positive, strict=True)]
        for u in self.units:
            while all(a >= b for a, b in zip(total, u, strict=True)):
                total = [a - b for a, b in zip(total, u, strict=True)]
        step = 0
        while sum(total) < least:
            more = self.units[step % len(self.units)] if self.units else self.positive
            total = [a + b for a, b in zip(total, more, strict=True)]
            step += 1
        return tuple(total)

    def shorter(self, vector: Sequence[int]) -> Vector:
        """The smaller of the effective vectors for a relation and its negative."""
        options = [self.effective(v) for v in (vector, [-c for c in vector])]
        return min(options, key=lambda v: (sum(v), v))

    def rows(self) -> list[Vector]:
        """Effective relations that span all relations between the points: units first, then by degree."""
        hard = {self.shorter(row) for row in self.relations}
        if self._positive is not None:
            hard.add(self._positive)
        units = set(self.units)
        hard = {row for row in hard if any(row) and row not in units}
        return [*self.units, *sorted(hard, key=lambda row: (sum(row), row))]


def _gain(unit: Vector, total: Sequence[int]) -> int:
    """By how much adding a unit lessens the negative part."""
    return sum(min(a, -b) for a, b in zip(unit, total, strict=True) if b < 0)
