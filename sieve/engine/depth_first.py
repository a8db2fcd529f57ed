"""Sieving in stages, the run: classes climb a ladder of subgroups in batches, the deepest batch first.

A class of L/K' above a class x of L/K is x + j b, 0 <= j < l, where b in K is not in K'.  For a condition
that sees K', the set of the j it allows depends on the class of x in J(F_v)/phi_v(K') alone: one look into a
table of bit masks serves all l lifts at once, and a class without lifts costs no more than that.  Memory is
that of a few batches on each step of the ladder, however many classes there are in all.

Large tables are hashed, and weak conditions are left out on the way; a class that slips through is caught by
exact semijoins at the end, so the result is the set of classes modulo M that all conditions allow, whatever
the ladder and the batches.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from math import log, prod

import numpy as np
from flint import fmpz_mat
from numpy.typing import NDArray

from sieve.engine.codes import CODE_LIMIT
from sieve.engine.join import semijoin
from sieve.engine.lift_tables import LiftTable, make_table, mask_type
from sieve.engine.relation import Relation, coarsen, merge_equal, trivial
from sieve.engine.staged import LARGEST_MODULUS, Ladder, Lift, thrown
from sieve.errors import Inconsistent, InternalError, LimitReached
from sieve.exact.primary import Characters

Classes = NDArray[np.int32]

BATCH = 1 << 16
"""A step is worked on when so many classes wait for it."""

BLOCK = 1 << 15
"""So many classes are worked on at once (they stay in the cache)."""

_FULL = 25.0
"""Conditions that throw more classes than this on each class of their quotient modulo M are left out."""


@dataclass(eq=False)
class Rung:
    """One step of the ladder with its filters.

    `shift` is b; `modulus`, M at the end of the stage (M L lies in K'); `tidy`, whether coordinates are
    reduced modulo M after the step; `waiting`, blocks of classes; `met`, how many came so far.
    """

    lift: Lift
    shift: tuple[int, ...]
    filters: tuple[LiftTable, ...]
    modulus: int
    tidy: bool
    waiting: list[Classes] = field(default_factory=list)
    met: int = 0

    @property
    def count(self) -> int:
        """How many classes wait."""
        return sum(map(len, self.waiting))


@dataclass(frozen=True, eq=False)
class Climb:
    """The result: `relation`, the classes modulo M that all conditions allow; `sizes`, for each step of the
    ladder how many classes were met before it (one of each pair x, -x if `halved`); `most_held`, the largest
    number of classes in memory at one time; `halved`."""

    relation: Relation
    sizes: tuple[int, ...]
    most_held: int
    halved: bool


def climb(relations: Sequence[Relation], ladder: Ladder, *, known: Sequence[Sequence[int]] = (),
          batch: int = BATCH, most: int | None = None, symmetric: bool | None = None,
          report: Callable[[Sequence[Rung]], None] | None = None) -> Climb:
    """The classes modulo M that all conditions allow, M being where the ladder ends.

    Conditions that cannot be expected to exclude a class modulo M (25 points on each class) are left out.
    Arguments: conditions with distinct names over L = Z^n, without labels; a ladder that `plan_ladder` made
    from them; vectors known to be allowed, which must pass every filter; the size of batches; the largest
    number of classes to be met in all (None: no limit); whether to follow one class of each pair x, -x only
    (None: if all conditions are symmetric); `report` sees the steps after each batch. Raises: `Inconsistent`
    when a known vector is excluded, naming it; `LimitReached` (partial: the numbers met so far); ValueError
    for M beyond `LARGEST_MODULUS`, for a ladder that ends within a stage, or when asked to halve conditions
    that are not symmetric.
    """
    if not relations or not ladder:
        return Climb(trivial(relations[0].n if relations else 0), (), 1, False)
    if not ladder[-1].last:
        raise ValueError("the ladder ends within a stage")
    exponents: dict[int, int] = {}
    for lift in ladder:
        exponents[lift.prime] = max(exponents.get(lift.prime, 0), lift.level + 1)
    modulus = prod(ell**e for ell, e in exponents.items())
    if modulus >= LARGEST_MODULUS:
        raise ValueError(f"the modulus {modulus} is too large")
    cut = [r for r in (coarsen(r, exponents) for r in relations if _load(r, exponents) < _FULL)
           if r.count < r.index]
    even = symmetric is not False and all(is_symmetric(r) for r in cut)
    if symmetric and not even:
        raise ValueError("the conditions are not symmetric")
    vectors = _reduced(known, modulus, relations[0].n)
    rungs = build_rungs(cut, ladder, vectors)
    halve_at = _halving(ladder) if even else -1
    ends, most_held = _drain(rungs, relations[0].n, batch, most, halve_at, report)
    if halve_at >= 0:
        ends = np.concatenate([ends, -ends])
    relation = _relation(ends, exponents, relations[0].n)
    for condition in cut:
        relation = semijoin(relation, condition)
    for vector in known:
        if not relation.contains(vector):
            raise Inconsistent(f"the known vector {tuple(vector)} is excluded", str(tuple(vector)))
    return Climb(relation, tuple(rung.met for rung in rungs), most_held, halve_at >= 0)


def _load(relation: Relation, exponents: dict[int, int]) -> float:
    """The number of classes thrown into the quotient modulo M, for each class of the quotient."""
    order = prod(part.prime ** min(e, exponents.get(part.prime, 0))
                 for part in relation.parts for e in part.exponents)
    return max(relation.count, 0 if relation.count == relation.index else thrown(relation)) / order


def is_symmetric(relation: Relation) -> bool:
    """Whether the classes are closed under x -> -x."""
    moduli = np.array(relation.moduli, dtype=np.int64)
    mirrored = merge_equal(Relation(relation.n, relation.parts, -relation.codes % moduli, ()))
    return bool(np.array_equal(mirrored.codes, merge_equal(relation.unlabelled()).codes))


def build_rungs(relations: Sequence[Relation], ladder: Ladder, known: Classes, most: int = 24) -> list[Rung]:
    """The subgroups of the ladder and the tables of the conditions it names, at most so many on each step.

    `known`: vectors, shape (count, n); raises `Inconsistent` when a table excludes one, ValueError when
    coordinates of classes might not fit into 32 bits.
    """
    n = relations[0].n if relations else len(ladder[0].character)
    basis = [[int(i == j) for j in range(n)] for i in range(n)]
    by_name = {r.name: r for r in relations}
    rungs: list[Rung] = []
    bound = 0
    for lift, modulus in zip(ladder, _stage_moduli(ladder), strict=True):
        finer, shift = _kernel(basis, lift)
        filters = []
        for name in lift.names[:most]:
            if name in by_name:
                made = make_table(by_name[name], finer, shift, lift.prime)
                if made is not None:
                    filters.append(made)
        growth = (lift.prime - 1) * max(map(abs, shift))
        if bound + growth >= CODE_LIMIT and rungs:
            rungs[-1].tidy, bound = True, modulus
        if bound + growth >= CODE_LIMIT:
            raise ValueError(f"the modulus {modulus} is too large for steps of order {lift.prime}")
        bound = modulus if lift.last else bound + growth
        rungs.append(Rung(lift, tuple(shift), tuple(filters), modulus, lift.last))
        basis = finer
        for made in filters:
            _check_known(made, known)
    return rungs


def _check_known(made: LiftTable, known: Classes) -> None:
    """A known vector is x + j b with j = 0 for x itself: bit 0 must be set."""
    if not len(known):
        return
    points = known.astype(np.float64)
    passed = made.masks[made.keys(points, float(np.abs(points).max()))] & made.masks.dtype.type(1)
    if not passed.all():
        bad = tuple(known[int(np.argmin(passed))].tolist())
        raise Inconsistent(f"the known vector {bad} is excluded by {made.name}", str(bad))


def _kernel(basis: Sequence[Sequence[int]], lift: Lift) -> tuple[list[list[int]], list[int]]:
    """A reduced basis of the kernel of the character on K, and a vector of K outside it."""
    ell, power = lift.prime, lift.prime**lift.level
    values = []
    for row in basis:
        value = sum(c * x for c, x in zip(lift.character, row, strict=True))
        if value % power:
            raise InternalError("a character of the ladder is not defined on its subgroup")
        values.append(value // power % ell)
    pivot = next((i for i, value in enumerate(values) if value), None)
    if pivot is None:
        raise InternalError("a character of the ladder vanishes on its subgroup")
    inverse = pow(values[pivot], -1, ell)
    rows = []
    for i, (row, value) in enumerate(zip(basis, values, strict=True)):
        factor = ell if i == pivot else -value * inverse % ell
        rows.append([factor * b + (0 if i == pivot else a)
                     for a, b in zip(row, basis[pivot], strict=True)])
    reduced = fmpz_mat(rows).lll()
    n = len(rows)
    return [[int(reduced[i, j]) for j in range(n)] for i in range(n)], list(basis[pivot])


def expand(rung: Rung, classes: Classes) -> Classes:
    """The lifts of classes, shape (count, n), that all filters of the step allow; their order is fixed."""
    pieces: list[Classes] = []
    for low in range(0, len(classes), BLOCK):
        _expand_block(rung, classes[low : low + BLOCK], pieces)
    return np.concatenate(pieces) if pieces else classes[:0]


def _expand_block(rung: Rung, block: Classes, pieces: list[Classes]) -> None:
    ell = rung.lift.prime
    word = mask_type(ell)
    masks = np.full(len(block), (1 << ell) - 1, dtype=word)
    numbers = block.astype(np.float64)
    bound = float(np.abs(numbers).max(initial=1.0))
    for place, made in enumerate(rung.filters):
        masks &= made.masks[made.keys(numbers, bound)]
        if place + 1 < len(rung.filters):
            alive = np.flatnonzero(masks != 0)
            if 4 * len(alive) < 3 * len(masks):
                masks, block, numbers = masks[alive], block.take(alive, axis=0), numbers.take(alive, axis=0)
    shift = np.array(rung.shift, dtype=np.int32)
    for j in range(ell):
        here = np.flatnonzero((masks & word(1 << j)) != 0)
        if len(here):
            lifts = block.take(here, axis=0)
            if j:
                lifts += np.int32(j) * shift
            pieces.append(lifts)


def _halving(ladder: Ladder) -> int:
    """The first step at the end of a stage M > 2 with a few classes: there -x is easily told from x."""
    return next((k for k, (lift, modulus) in enumerate(zip(ladder, _stage_moduli(ladder), strict=True))
                 if lift.last and modulus > 2 and lift.log_size > log(50)), -1)


def _tidied(classes: Classes, modulus: int, halve: bool) -> Classes:
    """Coordinates reduced to 0..M-1; of x and -x only the first in lexicographic order if asked."""
    classes = classes % np.int32(modulus)
    if not halve:
        return classes
    keep = np.zeros(len(classes), dtype=bool)
    undecided = np.ones(len(classes), dtype=bool)
    for column in classes.T:
        mirror = -column % np.int32(modulus)
        keep |= undecided & (column < mirror)
        undecided &= column == mirror
    return classes[keep | undecided]


def _drain(rungs: Sequence[Rung], n: int, batch: int, most: int | None, halve_at: int,
           report: Callable[[Sequence[Rung]], None] | None) -> tuple[Classes, int]:
    """Work on the deepest step with a full batch, else on the first step where classes wait.

    Every step but the one just filled holds less than a batch: memory is bounded by that and one output.
    """
    rungs[0].waiting.append(np.zeros((1, n), dtype=np.int32))
    rungs[0].met = 1
    ends: list[Classes] = []
    held = most_held = met = 1
    while held:
        counts = [rung.count for rung in rungs]
        full = [k for k, count in enumerate(counts) if count >= batch]
        here = full[-1] if full else next(k for k, count in enumerate(counts) if count)
        block = _take(rungs[here], batch)
        found = expand(rungs[here], block)
        if rungs[here].tidy:
            found = _tidied(found, rungs[here].modulus, here == halve_at)
        held += len(found) - len(block)
        met += len(found)
        most_held = max(most_held, held + len(block))
        if here + 1 < len(rungs):
            if len(found):
                rungs[here + 1].waiting.append(found)
                rungs[here + 1].met += len(found)
        else:
            ends.append(found)
            held -= len(found)
        if report is not None:
            report(rungs)
        if most is not None and met > most:
            raise LimitReached("classes met", str(most), tuple(rung.met for rung in rungs))
    return (np.concatenate(ends) if ends else np.zeros((0, n), dtype=np.int32)), most_held


def _take(rung: Rung, batch: int) -> Classes:
    """At most a batch of the classes that wait, the last ones."""
    taken: list[Classes] = []
    room = batch
    while rung.waiting and room:
        block = rung.waiting.pop()
        if len(block) > room:
            rung.waiting.append(block[: len(block) - room])
            block = block[len(block) - room :]
        room -= len(block)
        taken.append(block)
    return np.concatenate(taken) if len(taken) > 1 else taken[0]


def _stage_moduli(ladder: Sequence[Lift]) -> list[int]:
    """For each step the modulus M at the end of its stage."""
    out: list[int] = []
    exponents: dict[int, int] = {}
    waiting = 0
    for lift in ladder:
        exponents[lift.prime] = lift.level + 1
        waiting += 1
        if lift.last:
            out.extend([prod(ell**e for ell, e in exponents.items())] * waiting)
            waiting = 0
    return out


def _reduced(vectors: Sequence[Sequence[int]], modulus: int, n: int) -> Classes:
    rows = [[c % modulus for c in vector] for vector in vectors]
    return np.array(rows, dtype=np.int32).reshape(len(rows), n)


def _relation(ends: Classes, exponents: dict[int, int], n: int) -> Relation:
    """Classes modulo M as a relation."""
    units = tuple(tuple(int(i == j) for j in range(n)) for i in range(n))
    parts = tuple(Characters(ell, units, (e,) * n) for ell, e in sorted(exponents.items()))
    blocks = [(ends % np.int32(ell**e)).astype(np.int64) for ell, e in sorted(exponents.items())]
    return merge_equal(Relation(n, parts, np.concatenate(blocks, axis=1), ()))


__all__ = ["BATCH", "Climb", "Rung", "build_rungs", "climb", "expand", "is_symmetric"]
