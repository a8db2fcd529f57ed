"""Sieving on from a few classes: x + M L is L again, with conditions on y of x + M y.

When few classes modulo M are left, each of them is the start of a sieve of its own, modulo M2 say, and all of
them together are the classes modulo M M2. What J(F_v) says modulo M is used up: of its allowed classes only
those near x are left, often none but that of a point, so these ladders are narrow however high.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from math import prod

import numpy as np

from sieve.engine.depth_first import climb
from sieve.engine.join import semijoin
from sieve.engine.relation import Relation, merge_equal
from sieve.engine.staged import Ladder, plan_ladder
from sieve.exact.primary import Characters
from sieve.exact.primes import valuation_of


def above(relation: Relation, modulus: int, vector: Sequence[int]) -> Relation:
    """The condition on y that x + M y satisfies the given one.

    Arguments: a relation over L = Z^n; M >= 1; x. The characters are those of M L, at each l with the power
    of l in M gone.

    >>> r = Relation(1, (Characters(2, ((1,),), (2,)),), np.array([[1], [2]]), ("v = 3",))
    >>> s = above(r, 2, [1])
    >>> s.parts[0].exponents, s.codes.tolist()
    ((1,), [[0]])
    """
    inside = np.ones(relation.count, dtype=bool)
    parts, blocks = [], []
    for part in relation.parts:
        level = valuation_of(modulus, part.prime)
        codes = relation.codes_at(part.prime)
        values = np.array(part.values(vector), dtype=np.int64)
        rows, exponents, columns = [], [], []
        for k, (row, e) in enumerate(zip(part.rows, part.exponents, strict=True)):
            step = part.prime ** min(level, e)
            gap = (codes[:, k] - values[k]) % part.prime**e
            inside &= gap % step == 0
            if e > level:
                small = part.prime ** (e - level)
                # the character of M L divided by the power of l, with the unit M / l^level
                rows.append(tuple(c * (modulus // step) % small for c in row))
                exponents.append(e - level)
                columns.append(gap // step)
        if rows:
            parts.append(Characters(part.prime, tuple(rows), tuple(exponents)))
            blocks.append(np.stack(columns, axis=1))
    joined = np.concatenate(blocks, axis=1) if blocks else np.zeros((relation.count, 0), dtype=np.int64)
    return merge_equal(replace(relation.unlabelled(), parts=tuple(parts), codes=joined[inside]))


def representatives(relation: Relation) -> tuple[int, list[tuple[int, ...]]]:
    """M and the classes of a relation modulo M L as vectors with entries 0..M-1.

    Raises ValueError when the subgroup is not M L with the coordinates as characters.
    """
    exponents = relation.exponents
    units = tuple(tuple(int(i == j) for j in range(relation.n)) for i in range(relation.n))
    if any(part.rows != units or set(part.exponents) != {exponents[part.prime]} for part in relation.parts):
        raise ValueError("the classes are not residues modulo an integer")
    modulus = prod(ell**e for ell, e in exponents.items())
    weights = {ell: modulus // ell**e * pow(modulus // ell**e, -1, ell**e) for ell, e in exponents.items()}
    out = []
    for row in relation.codes.tolist():
        out.append(tuple(sum(weights[ell] * row[columns][j] for ell, columns in relation.columns.items())
                         % modulus for j in range(relation.n)))
    return modulus, out


def _same(a: Sequence[int], b: Sequence[int], modulus: int) -> bool:
    return all((x - y) % modulus == 0 for x, y in zip(a, b, strict=True))


def climb_further(relations: Sequence[Relation], found: Relation, tops: Mapping[int, int], least_index: float,
                  *, known: Sequence[Sequence[int]] = (), rest: float = 1.0,
                  most: int | None = None) -> tuple[Relation, Ladder]:
    """The classes modulo M M2 that all conditions allow, from the classes modulo M.

    Arguments: conditions with distinct names; the classes modulo M that they leave, as `climb` gives them;
    the largest exponents in M2; log of the index that M2 L must have; known vectors; aims and limits as for
    `plan_ladder` and `climb` (for each class). Returns the classes and the ladder, which is planned for the
    first class and serves all. Raises as `climb` does.
    """
    modulus, vectors = representatives(found)
    # classes of points first: the ladder is planned for one of those
    vectors.sort(key=lambda x: (not any(_same(point, x, modulus) for point in known), x))
    relations = [semijoin(r, found) for r in relations]
    ladder: Ladder = ()
    extra: dict[int, int] = {}
    blocks: dict[int, list[np.ndarray]] = {}
    for vector in vectors:
        here = [above(r, modulus, vector) for r in relations]
        if not ladder:
            ladder = plan_ladder(here, tops, least_index, rest=rest)
            for lift in ladder:
                extra[lift.prime] = lift.level + 1
        near = [[(a - b) // modulus for a, b in zip(point, vector, strict=True)] for point in known
                if _same(point, vector, modulus)]
        higher = climb(here, ladder, known=near, most=most).relation
        for ell in sorted({*found.exponents, *extra}):
            e = found.exponents.get(ell, 0) + extra.get(ell, 0)
            steps = higher.codes_at(ell) if ell in extra else np.zeros((higher.count, found.n), np.int64)
            base = np.array([x % ell**e for x in vector], dtype=np.int64)
            blocks.setdefault(ell, []).append((base + modulus % ell**e * steps) % ell**e)
    units = tuple(tuple(int(i == j) for j in range(found.n)) for i in range(found.n))
    parts = tuple(Characters(ell, units, (found.exponents.get(ell, 0) + extra.get(ell, 0),) * found.n)
                  for ell in sorted(blocks))
    codes = [np.concatenate(blocks[part.prime]) for part in parts]
    joined = np.concatenate(codes, axis=1) if codes else np.zeros((0, 0), dtype=np.int64)
    return merge_equal(Relation(found.n, parts, joined, found.sources)), ladder


__all__ = ["above", "climb_further", "representatives"]
