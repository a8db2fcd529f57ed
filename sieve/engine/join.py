"""Join, semijoin and projection of relations on their common quotient.

For K1 and K2 with characters M1 and M2 the common quotient L/(K1 + K2) has the characters M1 and M2 share,
and L/(K1 cap K2) the characters M1 + M2.  Both come out of one small elimination for each prime.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from sieve.engine.codes import CodeArray, class_ids, combine
from sieve.engine.relation import Relation, coarsen, merge_equal
from sieve.errors import LimitReached
from sieve.exact.primary import Characters, Intersection, intersect, intersection_length


@lru_cache(maxsize=1 << 14)
def _meeting(a: Characters, b: Characters) -> Intersection:
    """The cached intersection of two modules of characters."""
    return intersect(a, b)


@lru_cache(maxsize=1 << 17)
def _meeting_length(a: Characters, b: Characters) -> int:
    """The cached composition length of the intersection."""
    return intersection_length(a, b)


def common_exponents(a: Relation, b: Relation) -> dict[int, int]:
    """For each prime l with a nontrivial common l-part the length of that part of L/(K1 + K2)."""
    out = {}
    for part in a.parts:
        other = b.by_prime.get(part.prime)
        if other is not None and (length := _meeting_length(part, other)):
            out[part.prime] = length
    return out


def common_index(a: Relation, b: Relation) -> int:
    """The index [L : K1 + K2], 1 when the relations do not interact."""
    out = 1
    for ell, length in common_exponents(a, b).items():
        out *= ell**length
    return out


def _common_codes(a: Relation, b: Relation) -> tuple[CodeArray, CodeArray, tuple[int, ...]]:
    """The classes of both relations in their common quotient, and the moduli of its columns."""
    left: list[CodeArray] = []
    right: list[CodeArray] = []
    moduli: list[int] = []
    for ell in common_exponents(a, b):
        meet = _meeting(a.by_prime[ell], b.by_prime[ell])
        divisors = [ell**v for v in meet.shifts]
        left.append(combine(a.codes_at(ell), meet.from_a, ell**meet.top, divisors))
        right.append(combine(b.codes_at(ell), meet.from_b, ell**meet.top, divisors))
        moduli.extend(meet.basis.moduli)
    if not moduli:
        return a.codes[:, :0], b.codes[:, :0], ()
    return np.concatenate(left, axis=1), np.concatenate(right, axis=1), tuple(moduli)


@dataclass(frozen=True, eq=False)
class Matching:
    """Which classes of two relations agree in the common quotient, before anything is built.

    Fields: `order_b`, the right classes sorted by their image there; `first` and `partners`, for each left
    class the place in `order_b` of its first partner and the number of its partners.
    """

    order_b: CodeArray
    first: CodeArray
    partners: CodeArray

    @property
    def size(self) -> int:
        """The number of classes of the join."""
        return int(self.partners.sum())


def match(a: Relation, b: Relation) -> Matching:
    """Count the partners of every class of the left relation; cost of a sort of the right one."""
    left, right, moduli = _common_codes(a, b)
    keys_a, keys_b = class_ids([left, right], moduli)
    order = np.argsort(keys_b, kind="stable")
    ordered = keys_b[order]
    first = np.searchsorted(ordered, keys_a, side="left")
    partners = np.searchsorted(ordered, keys_a, side="right") - first
    return Matching(order, first, partners)


def semijoin_mask(a: Relation, b: Relation) -> NDArray[np.bool_]:
    """Which classes of the left relation have a partner in the right one; bool, shape (a.count,)."""
    if b.count == 0:
        return np.zeros(a.count, dtype=bool)
    left, right, moduli = _common_codes(a, b)
    if not moduli:
        return np.ones(a.count, dtype=bool)
    keys_a, keys_b = class_ids([left, right], moduli)
    return np.isin(keys_a, keys_b)


def semijoin(a: Relation, b: Relation) -> Relation:
    """The left relation without the classes that the right one excludes; its sources grow if something
    went."""
    mask = semijoin_mask(a, b)
    if mask.all():
        return a
    return replace(a.select(mask), sources=_union(a.sources, b.sources))


def _union(a: Sequence[str], b: Sequence[str]) -> tuple[str, ...]:
    return tuple(sorted({*a, *b}))


def join(a: Relation, b: Relation, cap: int | None = None, matching: Matching | None = None) -> Relation:
    """The relation K1 cap K2 with all classes whose projections lie in both sets.

    Arguments: two relations over the same L; the largest number of classes wanted (None: no limit); the
    result of `match(a, b)` if it is known already. Returns: the join; its classes come in the order of the
    left classes.  Labels are those of the left relation, or of the right one when the left has none. Raises:
    LimitReached before anything is built, when the join has more than `cap` classes (`partial` = the number).
    Expected size: |W1| |W2| / [L : K1 + K2].
    """
    found = match(a, b) if matching is None else matching
    if cap is not None and found.size > cap:
        raise LimitReached("classes of a join", str(cap), found.size)
    take_a = np.repeat(np.arange(a.count), found.partners)
    starts = np.cumsum(found.partners) - found.partners
    take_b = found.order_b[np.arange(take_a.size) - np.repeat(starts - found.first, found.partners)]
    parts, blocks = [], []
    for ell in sorted({*a.by_prime, *b.by_prime}):
        left, right = a.by_prime.get(ell), b.by_prime.get(ell)
        if left is not None and right is not None:
            both = _meeting(left, right).sum
            given = np.concatenate([a.codes_at(ell)[take_a], b.codes_at(ell)[take_b]], axis=1)
            parts.append(both.basis)
            blocks.append(combine(given, both.forward, ell**both.top, [ell**v for v in both.shifts]))
        elif left is not None:
            parts.append(left)
            blocks.append(a.codes_at(ell)[take_a])
        elif right is not None:
            parts.append(right)
            blocks.append(b.codes_at(ell)[take_b])
    codes = np.concatenate(blocks, axis=1) if blocks else np.zeros((take_a.size, 0), dtype=np.int64)
    if a.tags is not None:
        tags, sets, complete = a.tags[take_a], a.label_sets, a.complete
    elif b.tags is not None:
        tags, sets, complete = b.tags[take_b], b.label_sets, b.complete
    else:
        tags, sets, complete = None, (), True
    return Relation(a.n, tuple(parts), codes, _union(a.sources, b.sources), tags, sets, complete=complete)


def project(a: Relation, parts: Mapping[int, Characters]) -> Relation:
    """The image of a relation in L/(K + K'), K' the subgroup with the given characters (by prime)."""
    target = Relation(a.n, tuple(parts[ell] for ell in sorted(parts)), np.zeros((0, sum(
        len(parts[ell].rows) for ell in parts)), dtype=np.int64), ())
    shared = common_exponents(a, target)
    codes, _, _ = _common_codes(a, target)
    kept = tuple(_meeting(a.by_prime[ell], target.by_prime[ell]).basis for ell in shared)
    return merge_equal(replace(a, parts=kept, codes=codes))


def arc_consistent(relations: Sequence[Relation], rounds: int = 8) -> list[Relation]:
    """Semijoin every relation with every other that interacts until nothing changes (or `rounds` passes).

    Returns the relations in the given order; sources grow where classes were dropped.  Stops early when one
    becomes empty (then no vector satisfies all of them).
    """
    current = list(relations)
    edges = [(i, j) for i in range(len(current)) for j in range(len(current))
             if i != j and common_exponents(current[i], current[j])]
    for _ in range(rounds):
        changed = False
        for i, j in edges:
            smaller = semijoin(current[i], current[j])
            if smaller is not current[i]:
                current[i], changed = smaller, True
                if smaller.count == 0:
                    return current
        if not changed:
            break
    return current


__all__ = ["Matching", "arc_consistent", "coarsen", "common_exponents", "common_index", "join", "match",
           "project", "semijoin", "semijoin_mask"]
