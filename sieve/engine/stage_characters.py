"""The characters of order l that a stage of the sieve has left, and which conditions see them.

A vector space over F_l shrinks by one dimension with every character taken; what a condition sees of it is a
subspace, and all lines of all these subspaces are listed, since each is a possible next step.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from itertools import product

import numpy as np
from numpy.typing import NDArray

IntArray = NDArray[np.int64]

_MOST_LINES = 20_000
"""Subspaces with more lines than this count by their given vectors only."""


@lru_cache(maxsize=256)
def _combinations(prime: int, rank: int) -> IntArray:
    """One vector for each line of F_l^rank, the first entry that is not 0 being 1; shape (lines, rank)."""
    if (prime**rank - 1) // (prime - 1) > _MOST_LINES:
        return np.eye(rank, dtype=np.int64)
    rows = [(0,) * lead + (1, *tail) for lead in range(rank)
            for tail in product(range(prime), repeat=rank - lead - 1)]
    return np.array(rows, dtype=np.int64)


@dataclass(frozen=True, eq=False)
class StageCharacters:
    """What the conditions see of the characters of order l of the current subgroup.

    F_l^d is the space of those characters that are left in the stage; `columns` says which of the n
    coordinates they are (the others are 0). `spaces`: for each rank r the conditions (numbers, shape (k,))
    and the independent vectors that span what they see (shape (k, r, d)).  `lines`, sorted ids of all lines
    seen; `line`, `owner`, `lead`: for each pair of a line and a condition that sees it the place in `lines`,
    the condition and the place of a vector that the line can replace in the span.
    """

    prime: int
    columns: tuple[int, ...]
    spaces: dict[int, tuple[IntArray, IntArray]]
    lines: IntArray
    line: IntArray
    owner: IntArray
    lead: IntArray

    @staticmethod
    def of(prime: int, columns: tuple[int, ...],
           spaces: dict[int, tuple[IntArray, IntArray]]) -> StageCharacters:
        """With the lines of all spaces."""
        ids, owners, leads = [], [], []
        inverse = np.array([0, *(pow(a, -1, prime) for a in range(1, prime))], dtype=np.int64)
        weights = np.array([prime**k for k in reversed(range(len(columns)))], dtype=np.int64)
        for rank, (who, vectors) in sorted(spaces.items()):
            choice = _combinations(prime, rank)
            # entries below l^2 n, far inside int64
            found = np.einsum("cr,krd->kcd", choice, vectors) % prime
            first = np.take_along_axis(found, (found != 0).argmax(axis=2)[:, :, None], axis=2)
            ids.append(((found * inverse[first] % prime) @ weights).reshape(-1))
            owners.append(np.repeat(who, len(choice)))
            leads.append(np.tile((choice != 0).argmax(axis=1), len(who)))
        empty = np.zeros(0, dtype=np.int64)
        ids_of = np.concatenate(ids) if ids else empty
        lines, line = np.unique(ids_of, return_inverse=True)
        return StageCharacters(prime, columns, spaces, lines, line.reshape(-1),
                           np.concatenate(owners) if owners else empty,
                           np.concatenate(leads) if leads else empty)

    def vector(self, place: int) -> tuple[int, ...]:
        """The vector of a line in F_l^d."""
        value, out = int(self.lines[place]), []
        for _ in self.columns:
            value, digit = divmod(value, self.prime)
            out.append(digit)
        return tuple(reversed(out))

    def without(self, place: int) -> StageCharacters:
        """What is left modulo the line: one coordinate fewer."""
        pivot_row = np.array(self.vector(place), dtype=np.int64)
        pivot = int((pivot_row != 0).argmax())
        keep = [j for j in range(len(self.columns)) if j != pivot]
        here = self.line == place
        drop = dict(zip(self.owner[here].tolist(), self.lead[here].tolist(), strict=True))
        spaces: dict[int, list[tuple[IntArray, IntArray]]] = {}
        for rank, (who, vectors) in self.spaces.items():
            left = ((vectors - vectors[:, :, pivot, None] * pivot_row) % self.prime)[:, :, keep]
            loses = np.isin(who, np.array(sorted(drop), dtype=np.int64))
            if not loses.all():
                spaces.setdefault(rank, []).append((who[~loses], left[~loses]))
            if loses.any() and rank > 1:
                fewer = np.stack([np.delete(rows, drop[int(v)], axis=0)
                                  for v, rows in zip(who[loses], left[loses], strict=True)])
                spaces.setdefault(rank - 1, []).append((who[loses], fewer))
        merged = {rank: (np.concatenate([who for who, _ in some]), np.concatenate([rows for _, rows in some]))
                  for rank, some in sorted(spaces.items())}
        return StageCharacters.of(self.prime, tuple(self.columns[j] for j in keep), merged)

    def any_line(self) -> tuple[int, ...]:
        """A character that no condition sees, for the end of a stage: the first coordinate."""
        return (1, *(0 for _ in self.columns[1:]))


__all__ = ["StageCharacters"]
