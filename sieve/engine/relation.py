"""Relations: a subgroup K of finite index in L = Z^n with a finite set of classes of L/K.

K is held by its characters, prime by prime, and a class by the values of the basis characters.  Quotients of
any size are possible since no class is ever packed into a single number for good.  Classes may carry
candidate labels, and every relation knows the conditions it was made from.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from math import prod

import numpy as np
from flint import fmpz
from numpy.typing import NDArray

from sieve.engine.codes import CodeArray, combine, distinct_rows, largest_exponent
from sieve.exact.primary import Characters, adapt
from sieve.local.condition import Condition


@dataclass(frozen=True, eq=False)
class Relation:
    """A finite-index subgroup K of L = Z^n and a set W of classes of L/K.

    Fields: `n`; `parts`, the characters of L/K for each prime that divides the index, by increasing prime;
    `codes`, int64, shape (count, number of basis characters of all parts), distinct rows; `sources`, the
    sorted names of the conditions that made it; `tags`, int64, shape (count,), places in `label_sets`, or
    None without labels; `label_sets`, sorted tuples of candidate labels; `outside`, labels none of whose
    classes lies in the image of L at all (dropped when the relation was made); `outside_count`, the number of
    allowed classes dropped that way; `complete`, for labelled relations: every rational point lies in one of
    the classes. K = L (no parts) is legal: then W is everything (count 1) or empty (count 0).
    """

    n: int
    parts: tuple[Characters, ...]
    codes: CodeArray
    sources: tuple[str, ...]
    tags: CodeArray | None = None
    label_sets: tuple[tuple[str, ...], ...] = ()
    outside: tuple[str, ...] = ()
    outside_count: int = 0
    complete: bool = True

    @property
    def name(self) -> str:
        """The names of the sources in one string."""
        return ", ".join(self.sources)

    @property
    def count(self) -> int:
        """The number of classes in W."""
        return int(self.codes.shape[0])

    @cached_property
    def index(self) -> int:
        """The index [L : K]."""
        return prod(part.order for part in self.parts)

    @cached_property
    def moduli(self) -> tuple[int, ...]:
        """The orders of the basis characters, one for each column of `codes`."""
        return tuple(q for part in self.parts for q in part.moduli)

    @cached_property
    def exponents(self) -> dict[int, int]:
        """For each prime of the index the largest exponent of a character."""
        return {part.prime: max(part.exponents) for part in self.parts}

    @cached_property
    def columns(self) -> dict[int, slice]:
        """For each prime the columns of `codes` that belong to it."""
        out: dict[int, slice] = {}
        start = 0
        for part in self.parts:
            out[part.prime] = slice(start, start + len(part.rows))
            start += len(part.rows)
        return out

    @cached_property
    def by_prime(self) -> dict[int, Characters]:
        """The parts by their prime."""
        return {part.prime: part for part in self.parts}

    @property
    def labels(self) -> tuple[str, ...]:
        """The labels that some class of W still carries, sorted; empty without labels."""
        if self.tags is None:
            return ()
        return tuple(sorted({label for tag in np.unique(self.tags) for label in self.label_sets[int(tag)]}))

    def codes_at(self, prime: int) -> CodeArray:
        """The columns of `codes` at one prime, shape (count, number of basis characters there)."""
        return self.codes[:, self.columns[prime]]

    def select(self, mask: NDArray[np.bool_]) -> Relation:
        """The same subgroup with the classes where `mask` (shape (count,)) is true."""
        tags = None if self.tags is None else self.tags[mask]
        return replace(self, codes=self.codes[mask], tags=tags)

    def with_labels(self, wanted: Collection[str]) -> Relation:
        """The classes that carry at least one of the wanted labels."""
        if self.tags is None:
            return self.select(np.zeros(self.count, dtype=bool))
        good = np.array([not set(wanted).isdisjoint(labels) for labels in self.label_sets], dtype=bool)
        return self.select(good[self.tags] if good.size else np.zeros(self.count, dtype=bool))

    def unlabelled(self) -> Relation:
        """The same relation without labels."""
        return replace(self, tags=None, label_sets=())

    def contains(self, vector: Sequence[int]) -> bool:
        """Whether the class of an integer vector of length n lies in W."""
        code = [c for part in self.parts for c in part.values(vector)]
        return bool((self.codes == np.array(code, dtype=np.int64)).all(axis=1).any())


def merge_equal(relation: Relation) -> Relation:
    """Make the rows of `codes` distinct and sorted; a class keeps the labels of all rows that were equal."""
    codes, where = distinct_rows(relation.codes, relation.moduli)
    if relation.tags is None:
        return replace(relation, codes=codes)
    tags = np.full(codes.shape[0], -1, dtype=np.int64)
    mixed: dict[int, set[int]] = {}
    tags[where] = relation.tags
    for place in np.flatnonzero(tags[where] != relation.tags):
        target = int(where[place])
        mixed.setdefault(target, {int(tags[target])}).add(int(relation.tags[place]))
    sets = list(relation.label_sets)
    known = {labels: i for i, labels in reversed(list(enumerate(sets)))}
    for target, members in sorted(mixed.items()):
        union = tuple(sorted({label for tag in members for label in sets[tag]}))
        if union not in known:
            known[union] = len(sets)
            sets.append(union)
        tags[target] = known[union]
    return replace(relation, codes=codes, tags=tags, label_sets=tuple(sets))


def coarsen(relation: Relation, exponents: Mapping[int, int]) -> Relation:
    """Replace K by the larger K + sum over l of l^exponents[l] L at the l-parts, and project W.

    Primes that are not named are dropped.  Sound: the class of every vector of W stays in the result.
    Exponents above the present ones change nothing.
    """
    if all(exponents.get(ell, 0) >= e for ell, e in relation.exponents.items()):
        return relation
    parts, blocks = [], []
    for part in relation.parts:
        small = part.truncated(exponents.get(part.prime, 0))
        if small.rows:
            parts.append(small)
            blocks.append(relation.codes_at(part.prime) % np.array(small.moduli, dtype=np.int64))
    codes = np.concatenate(blocks, axis=1) if blocks else relation.codes[:, :0]
    return merge_equal(replace(relation, parts=tuple(parts), codes=codes))


def trivial(n: int, sources: Sequence[str] = ()) -> Relation:
    """The relation that says nothing: K = L with its one class."""
    return Relation(n, (), np.zeros((1, 0), dtype=np.int64), tuple(sorted(set(sources))))


def _prime_parts(condition: Condition, primes: Collection[int] | None,
                 max_exponents: Mapping[int, int] | None) -> dict[int, list[tuple[int, int]]]:
    """For each usable prime l the pairs (j, e): coordinate j of A modulo l^e."""
    out: dict[int, list[tuple[int, int]]] = {}
    for j, modulus in enumerate(condition.moduli):
        if primes is None:
            found = [int(ell) for ell, _ in fmpz(modulus).factor()]
        else:
            found = [ell for ell in sorted(set(primes)) if modulus % ell == 0]
        for ell in found:
            e, rest = 0, modulus
            while rest % ell == 0:
                e, rest = e + 1, rest // ell
            e = min(e, largest_exponent(ell), (max_exponents or {}).get(ell, e))
            if e > 0:
                out.setdefault(ell, []).append((j, e))
    return out


def relation_from_condition(condition: Condition, primes: Collection[int] | None = None,
                            max_exponents: Mapping[int, int] | None = None) -> Relation:
    """The relation of a condition: K = kernel of L -> A, W = classes with an allowed image.

    Arguments: the condition; the primes l whose l-parts may be used (None: all that divide the order of A);
    for some primes a bound for the exponent (coarser, still sound).  Prime powers from 2^31 on are coarsened.
    Allowed classes outside the image of L in the part of A in use are dropped and counted; the labels lost
    that way are in `outside`.  Labels of classes that coincide in the part in use are merged.
    """
    allowed = condition.allowed
    n = len(condition.images)
    parts, blocks = [], []
    inside = np.ones(condition.count, dtype=bool)
    for ell, pieces in sorted(_prime_parts(condition, primes, max_exponents).items()):
        rows = [[int(image[j]) % ell**e for image in condition.images] for j, e in pieces]
        exponents = [e for _, e in pieces]
        found = adapt(ell, rows, exponents)
        modulus = ell**found.top
        codes = np.stack([allowed[:, j] % ell**e for j, e in pieces], axis=1).astype(np.int64, copy=False)
        if found.syzygies:
            failed = combine(codes, found.syzygies, modulus, [1] * len(found.syzygies))
            inside &= ~failed.any(axis=1)
        if found.basis.rows:
            parts.append(found.basis)
            # rows outside the image give meaningless codes here; they are dropped below
            blocks.append(combine(codes, found.forward, modulus, [ell**v for v in found.shifts]))
    codes = np.concatenate(blocks, axis=1) if blocks else np.zeros((condition.count, 0), dtype=np.int64)
    tags: CodeArray | None = None
    sets: tuple[tuple[str, ...], ...] = ()
    outside: tuple[str, ...] = ()
    if condition.labels is not None:
        sets = tuple(tuple(sorted(set(labels))) for labels in condition.labels)
        tags = np.arange(condition.count, dtype=np.int64)[inside]
        kept = {label for i in tags for label in sets[int(i)]}
        outside = tuple(sorted({label for labels in sets for label in labels} - kept))
    raw = Relation(n, tuple(parts), codes[inside], (condition.name,), tags, sets, outside,
                   int(condition.count - inside.sum()), condition.complete)
    return merge_equal(raw)
