"""The sieve of the textbooks, for comparison: lift all classes from modulus N to q N, then filter.

Bruin and Stoll, "The Mordell-Weil sieve: proving non-existence of rational points on curves" (2010), section
3.  It meets far larger sets than joins do; it serves the benchmark and is an independent oracle for the
joins.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np
from flint import fmpz

from sieve.engine.codes import CodeArray, class_ids
from sieve.engine.relation import Relation, coarsen
from sieve.errors import LimitReached


@dataclass(frozen=True, eq=False)
class Lifted:
    """The vectors modulo `modulus` that pass, int64 of shape (count, n), and the sizes met.

    `largest` is the largest set before filtering; `trace` has for each step the modulus, the size after
    lifting and the size after filtering.
    """

    modulus: int
    vectors: CodeArray
    largest: int
    trace: tuple[tuple[int, int, int], ...]


def _passes(vectors: CodeArray, relation: Relation) -> np.ndarray:
    """Which vectors (entries below 2^31) have their class in the relation; bool, shape (count,)."""
    columns = []
    for part in relation.parts:
        for row, q in zip(part.rows, part.moduli, strict=True):
            value = np.zeros(vectors.shape[0], dtype=np.int64)
            for j, c in enumerate(row):
                # both factors are below q < 2^31
                value = (value + vectors[:, j] % q * c) % q
            columns.append(value)
    codes = np.stack(columns, axis=1) if columns else np.zeros((vectors.shape[0], 0), dtype=np.int64)
    ours, theirs = class_ids([codes, relation.codes], relation.moduli)
    return np.isin(ours, theirs)


def lift_and_filter(relations: Sequence[Relation], path: Sequence[int], cap: int = 10**7) -> Lifted:
    """All vectors of Z^n modulo the product of the path that every condition allows there.

    Arguments: relations over Z^n; the factors q by which the modulus grows (any integers >= 2, product below
    2^31); the largest set allowed after a lift. Raises: LimitReached when a lift would exceed the cap.

    >>> from sieve.engine.relation import trivial
    >>> lift_and_filter([trivial(2)], [2, 3]).vectors.shape
    (36, 2)
    """
    n = relations[0].n
    modulus, vectors = 1, np.zeros((1, n), dtype=np.int64)
    largest, trace = 1, []
    for q in path:
        lifted = vectors.shape[0] * q**n
        if lifted > cap:
            raise LimitReached("classes after a lift", str(cap), lifted)
        if modulus * q >= 1 << 31:
            raise LimitReached("modulus", "2^31", modulus * q)
        digits = np.array(list(product(range(q), repeat=n)), dtype=np.int64).reshape(q**n, n)
        vectors = (vectors[:, None, :] + modulus * digits[None, :, :]).reshape(-1, n)
        modulus *= q
        largest = max(largest, lifted)
        visible = {int(ell): int(e) for ell, e in fmpz(modulus).factor()}
        for relation in relations:
            small = coarsen(relation, visible)
            if small.count < small.index:
                vectors = vectors[_passes(vectors, small)]
        trace.append((modulus, lifted, int(vectors.shape[0])))
    return Lifted(modulus, vectors, largest, tuple(trace))
