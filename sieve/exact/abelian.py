"""Finite abelian groups given by generators and relations."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import prod

import flint


@dataclass(frozen=True)
class FiniteQuotient:
    """Z^n modulo a lattice of full rank, with coordinates.

    `invariants` are the invariant factors > 1, each dividing the next; `coordinates[j]` is the class of the
    j-th basis vector of Z^n in the product of Z/invariants[i]; `lattice` is the Hermite form of the
    relations.

    >>> q = quotient_by(2, [[2, 0], [0, 4], [1, 2]])
    >>> q.invariants, q.order
    ((4,), 4)
    """

    invariants: tuple[int, ...]
    coordinates: tuple[tuple[int, ...], ...]
    order: int

    def reduce(self, vector: Sequence[int]) -> tuple[int, ...]:
        """The class of an integer vector of length n."""
        total = [0] * len(self.invariants)
        for a, row in zip(vector, self.coordinates, strict=True):
            if a:
                total = [t + a * c for t, c in zip(total, row, strict=True)]
        return tuple(t % d for t, d in zip(total, self.invariants, strict=True))


def smith_with_coordinates(matrix: Sequence[Sequence[int]]) -> tuple[tuple[int, ...], list[list[int]]]:
    """Smith form of a square nonsingular integer matrix whose rows are relations.

    Returns (d, C): the diagonal entries d_1 | d_2 | .. (ones included) and the n x n matrix C such that basis
    vector j of Z^n has class (C[j][i] mod d_i)_i in the product of Z/d_i.  Entries are reduced modulo the
    determinant on the way.  Plain elimination (Cohen 1993, algorithm 2.4.14): for small matrices.
    """
    n = len(matrix)
    a = [[int(c) for c in row] for row in matrix]
    right = [[int(i == j) for j in range(n)] for i in range(n)]  # column operations: a * right
    for k in range(n):
        while True:
            pivot = min(
                ((abs(a[i][j]), i, j) for i in range(k, n) for j in range(k, n) if a[i][j]), default=None
            )
            if pivot is None:
                raise ValueError("singular relation matrix")
            _, i, j = pivot
            a[k], a[i] = a[i], a[k]
            for row in a:
                row[k], row[j] = row[j], row[k]
            for row in right:
                row[k], row[j] = row[j], row[k]
            p = a[k][k]
            clean = True
            for i in range(k + 1, n):
                q = a[i][k] // p
                if q:
                    a[i] = [x - q * y for x, y in zip(a[i], a[k], strict=True)]
                clean = clean and a[i][k] == 0
            for j in range(k + 1, n):
                q = a[k][j] // p
                if q:
                    for row in a:
                        row[j] -= q * row[k]
                    for row in right:
                        row[j] -= q * row[k]
                clean = clean and a[k][j] == 0
            if not clean:
                continue
            offender = next((i for i in range(k + 1, n) for j in range(k + 1, n) if a[i][j] % p), None)
            if offender is None:
                break
            a[k] = [x + y for x, y in zip(a[k], a[offender], strict=True)]
    diagonal = tuple(abs(a[i][i]) for i in range(n))
    # relations R = U^-1 D V^-1 with V = right: the class of e_j is row j of V, coordinatewise
    coordinates = [[right[j][i] % diagonal[i] for i in range(n)] for j in range(n)]
    return diagonal, coordinates


def quotient_by(n: int, relations: Sequence[Sequence[int]]) -> FiniteQuotient | None:
    """Z^n modulo the lattice spanned by `relations` (rows of length n), or None when the rank is below n.

    The Hermite form leaves few columns with a pivot above 1; only these go through the Smith form.
    """
    if n == 0:
        return FiniteQuotient((), (), 1)
    if len(relations) < n:
        return None
    matrix = flint.fmpz_mat([list(map(int, row)) for row in relations]).hnf()
    rows = [[int(matrix[i, j]) for j in range(n)] for i in range(n)]
    pivots = [rows[i][i] for i in range(n)]
    if any(p == 0 for p in pivots):
        return None
    big = [i for i in range(n) if pivots[i] > 1]
    diagonal, small = smith_with_coordinates([[rows[i][j] for j in big] for i in big]) if big else ((), [])
    keep = [i for i, d in enumerate(diagonal) if d > 1]
    invariants = tuple(diagonal[i] for i in keep)
    place = {column: k for k, column in enumerate(big)}
    coordinates: list[tuple[int, ...]] = []
    for j in range(n):
        if j in place:
            coordinates.append(tuple(small[place[j]][i] for i in keep))
        else:
            row = rows[j]
            coordinates.append(
                tuple(
                    -sum(row[column] * small[k][i] for column, k in place.items()) % diagonal[i] for i in keep
                )
            )
    return FiniteQuotient(invariants, tuple(coordinates), prod(pivots))
