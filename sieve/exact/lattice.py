"""Lattices in Z^r: kernels of characters, reduced bases, shortest vectors of cosets, all with integers.

Reduction by LLL (Lenstra, Lenstra, Lovasz 1982; done by FLINT), enumeration in the manner of Fincke and Pohst
(1985), each level from the centre outwards (Schnorr, Euchner 1994).  No floating point anywhere.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass
from math import lcm

from flint import fmpz_mat

from sieve.exact.primary import Characters

Vector = tuple[int, ...]


def _rows(matrix: fmpz_mat) -> list[Vector]:
    return [tuple(int(matrix[i, j]) for j in range(matrix.ncols())) for i in range(matrix.nrows())]


def hermite(rows: Sequence[Sequence[int]]) -> list[Vector]:
    """The row Hermite form of an integer matrix, without its zero rows (upper triangular, pivots positive).

    >>> hermite([(2, 4), (0, 3), (4, 8)])
    [(2, 1), (0, 3)]
    """
    if not rows or not len(rows[0]):
        return []
    return [row for row in _rows(fmpz_mat([list(row) for row in rows]).hnf()) if any(row)]


def kernel_lattice(n: int, modules: Sequence[Characters]) -> list[Vector]:
    """The Hermite basis of the vectors of Z^n that all given characters kill.

    The dual lattice is spanned by Z^n and the rows u_i / l^e_i; its inverse transpose is the kernel.

    >>> kernel_lattice(2, [Characters(3, ((1, 2),), (2,))])
    [(1, 4), (0, 9)]
    """
    level = lcm(*(q for module in modules for q in module.moduli))
    dual = [[level * int(i == j) for j in range(n)] for i in range(n)]
    for module in modules:
        for row, q in zip(module.rows, module.moduli, strict=True):
            dual.append([x * (level // q) for x in row])
    inverse = fmpz_mat([list(row) for row in hermite(dual)]).inv()
    return hermite([[int((inverse[j, i] * level).p) for j in range(n)] for i in range(n)])


def right_inverse(prime: int, exponent: int, rows: Sequence[Vector]) -> list[Vector]:
    """Vectors w_i with rows[j] . w_i = [i = j] modulo prime^exponent, for rows independent modulo the prime.

    >>> right_inverse(3, 2, [(1, 2), (0, 1)])
    [(1, 0), (7, 1)]
    """
    modulus, n, k = prime**exponent, len(rows[0]) if rows else 0, len(rows)
    left = [[x % modulus for x in row] + [int(i == j) for j in range(k)] for i, row in enumerate(rows)]
    pivots = []
    for i in range(k):
        j = next(j for j in range(n) if left[i][j] % prime)
        inverse = pow(left[i][j], -1, modulus)
        left[i] = [x * inverse % modulus for x in left[i]]
        for other in range(k):
            factor = left[other][j]
            if other != i and factor:
                left[other] = [(x - factor * y) % modulus for x, y in zip(left[other], left[i], strict=True)]
        pivots.append(j)
    out = [[0] * n for _ in range(k)]
    for i, j in enumerate(pivots):
        for column in range(k):
            out[column][j] = left[i][n + column]
    return [tuple(row) for row in out]


class Cosets:
    """Representatives of the classes of Z^n modulo the common kernel of given characters.

    `lift` maps the values of all basis characters (module by module) to a vector of Z^n with these values.

    >>> Cosets(1, [Characters(2, ((1,),), (1,)), Characters(3, ((2,),), (1,))]).lift((1, 1))
    (5,)
    """

    def __init__(self, n: int, modules: Sequence[Characters]) -> None:
        self.n = n
        self.level = lcm(*(q for module in modules for q in module.moduli))
        self.columns: list[Vector] = []
        for module in modules:
            e = max(module.exponents, default=0)
            power = module.prime**e
            rest = self.level // power
            one = rest * pow(rest, -1, power) if power > 1 else 0
            self.columns += [tuple(one * x for x in w) for w in right_inverse(module.prime, e, module.rows)]

    def lift(self, codes: Sequence[int]) -> Vector:
        """A vector with entries in 0..level - 1 and the given character values (Python integers)."""
        out = [0] * self.n
        for code, column in zip(codes, self.columns, strict=True):
            if code:
                for i, x in enumerate(column):
                    out[i] += code * x
        return tuple(x % self.level for x in out)


@dataclass(frozen=True)
class Found:
    """A vector of a coset with its squared Euclidean norm."""

    norm: int
    vector: Vector


class ReducedLattice:
    """A lattice of full rank r in Z^r with an LLL-reduced basis and its integral Gram-Schmidt data.

    Arguments: rows that span a sublattice of finite index of Z^r (dependent rows are allowed).
    Method of the integral data: d_i = determinant of the Gram matrix of b_1..b_i, lambda_ij = d_j mu_ij
    (Cohen 1993, section 2.6.3).
    """

    #: fixed-point digits of the lower bounds used for pruning
    _SHIFT = 24

    def __init__(self, rows: Sequence[Sequence[int]]) -> None:
        basis = hermite(rows)
        self.rank = len(basis)
        if basis and len(basis) != len(basis[0]):
            raise ValueError("the rows span a lattice of smaller rank")
        if self.rank:
            basis = _rows(fmpz_mat([list(row) for row in basis]).lll())
        self.basis = basis
        self.d = [1]
        self.lam: list[list[int]] = []
        for row in basis:
            self.lam.append(self._project(row, len(self.lam), include_self=True))
            self.d.append(self.lam[-1].pop())

    def _project(self, vector: Sequence[int], count: int, include_self: bool = False) -> list[int]:
        """lambda of a vector against the first `count` basis vectors (and itself: then the next d)."""
        out: list[int] = []
        for j in range(count + int(include_self)):
            other = self.basis[j] if j < count else vector
            u = sum(x * y for x, y in zip(vector, other, strict=True))
            row = self.lam[j] if j < count else out
            for i in range(j):
                u = (self.d[i + 1] * u - out[i] * row[i]) // self.d[i]
            out.append(u)
        return out

    def reduce(self, vector: Sequence[int]) -> Vector:
        """A short vector of the coset by rounding plane by plane (Babai 1986)."""
        v = list(vector)
        coordinates = self._project(v, self.rank)
        for i in reversed(range(self.rank)):
            d = self.d[i + 1]
            x = (2 * coordinates[i] + d) // (2 * d)
            if x:
                v = [a - x * b for a, b in zip(v, self.basis[i], strict=True)]
                coordinates[i] -= x * d
                for j in range(i):
                    coordinates[j] -= x * self.lam[i][j]
        return tuple(v)

    def shortest(self, vector: Sequence[int], exclude: Collection[Vector] = (),
                 bound: int | None = None) -> Found | None:
        """The shortest vector of the coset of `vector` that is not excluded, exactly.

        Arguments: a vector of Z^r; vectors not to be returned; a bound for the squared norm (None: no bound).
        Returns: the smallest by (norm, vector), or None if all vectors with squared norm <= bound are
        excluded.

        >>> ReducedLattice([(5, 0), (0, 7)]).shortest((3, 3))
        Found(norm=13, vector=(-2, 3))
        """
        start = self.reduce(vector)
        if self.rank == 0:
            norm = sum(x * x for x in start)
            good = start not in exclude and (bound is None or norm <= bound)
            return Found(norm, start) if good else None
        best: Found | None = None
        limit = bound
        first = sum(x * x for x in start)
        if start not in exclude and (limit is None or first <= limit):
            best, limit = Found(first, start), first
        shift, d, lam, rank = self._SHIFT, self.d, self.lam, self.rank
        targets = self._project(start, rank)
        # per level: chosen integers, numerators of the centres, lower bounds of the norm so far (fixed point)
        chosen = [0] * rank

        def visit(level: int, partial: int) -> None:
            nonlocal best, limit
            centre = targets[level] + sum(chosen[j] * lam[j][level] for j in range(level + 1, rank))
            scale, weight = d[level + 1], d[level] * d[level + 1]
            for x in _outwards(-centre, scale):
                here = partial + (((x * scale + centre) ** 2 << shift) // weight)
                if limit is not None and here > limit << shift:
                    return
                chosen[level] = x
                if level:
                    visit(level - 1, here)
                    continue
                found = tuple(
                    a + sum(c * row[i] for c, row in zip(chosen, self.basis, strict=True))
                    for i, a in enumerate(start)
                )
                norm = sum(a * a for a in found)
                if (limit is None or norm <= limit) and found not in exclude:
                    candidate = Found(norm, found)
                    if best is None or (norm, found) < (best.norm, best.vector):
                        best, limit = candidate, norm

        visit(rank - 1, 0)
        return best


def _outwards(numerator: int, denominator: int) -> Iterator[int]:
    """All integers by growing distance from numerator / denominator (denominator > 0)."""
    low = numerator // denominator
    high = low + 1
    while True:
        if numerator - low * denominator <= high * denominator - numerator:
            yield low
            low -= 1
        else:
            yield high
            high += 1
