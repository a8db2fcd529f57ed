"""Coordinates of known points in the given generators, and generators from known points.

The combinations of given divisor classes that vanish in many J(F_v) form a lattice of enormous index in
which the true relations stand out as very short vectors.  Nothing found here is a premise of a verdict:
coordinates serve as checks of the data, and generators found this way are divisors like any others.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from math import gcd, isqrt

import flint

from sieve.errors import Inconsistent
from sieve.exact.lattice import hermite

SEPARATION = 1000
"""How many times shorter than a vector of the lattice should be by chance a relation must be."""


def vanishing_lattice(
    size: int, functionals: Sequence[tuple[int, Sequence[int]]]
) -> tuple[list[list[int]], bool]:
    """The integer vectors of length `size` on which all functionals vanish, as an LLL-reduced basis.

    Arguments: pairs (modulus, coefficients).  The second value says that the later half of the functionals
    (at least 8) cut nothing off any more: then the group in question is finite and the lattice is all
    relations.
    """
    basis = [[int(i == j) for j in range(size)] for i in range(size)]
    last_cut = 0
    for count, (modulus, coefficients) in enumerate(functionals, start=1):
        values = [sum(a * c for a, c in zip(row, coefficients, strict=True)) % modulus for row in basis]
        # euclidean steps between rows leave one row with the gcd
        while True:
            live = sorted((value, i) for i, value in enumerate(values) if value)
            if len(live) <= 1:
                break
            small, pivot = live[0]
            for value, i in live[1:]:
                quotient = value // small
                basis[i] = [a - quotient * b for a, b in zip(basis[i], basis[pivot], strict=True)]
                values[i] = value - quotient * small
        if live:
            value, pivot = live[0]
            factor = modulus // gcd(modulus, value)
            basis[pivot] = [factor * a for a in basis[pivot]]
            if factor > 1:
                last_cut = count
        if count % 8 == 0:
            basis = _lll(basis)
    settled = len(functionals) >= 16 and 2 * last_cut <= len(functionals)
    return _lll(basis), settled


def _lll(rows: Sequence[Sequence[int]]) -> list[list[int]]:
    if not rows:
        return []
    reduced = flint.fmpz_mat([list(row) for row in rows]).lll()
    return [[int(reduced[i, j]) for j in range(reduced.ncols())] for i in range(reduced.nrows())]


def true_relations(basis: Sequence[Sequence[int]], settled: bool) -> list[list[int]]:
    """The reduced basis vectors far shorter than chance allows: those before the first gap in length.

    A gap is a factor `SEPARATION`; before the first vector a length of 1 counts.  All of them when `settled`.
    """
    ordered = sorted(basis, key=lambda row: (sum(a * a for a in row), row))
    if settled:
        return [list(row) for row in ordered]
    previous = 1
    for k, row in enumerate(ordered):
        length = isqrt(sum(a * a for a in row)) + 1
        if length > SEPARATION * previous:
            return [list(r) for r in ordered[:k]]
        previous = length
    # no gap: everything is short, or there are too few functionals
    return []


@dataclass(frozen=True)
class PointCoordinates:
    """denominator * [P - B] = sum free[i] D_i + sum torsion[j] T_j; denominator 1 for points of the group."""

    free: tuple[int, ...]
    torsion: tuple[int, ...]
    denominator: int

    @property
    def coefficients(self) -> tuple[Fraction, ...]:
        """The rational coefficients on the free generators."""
        return tuple(Fraction(a, self.denominator) for a in self.free)

    @property
    def vector(self) -> tuple[int, ...]:
        """Free and torsion coordinates together, for points of the group (denominator 1)."""
        return self.free + self.torsion


def generator_relations(
    rank: int, orders: Sequence[int], functionals: Sequence[tuple[int, Sequence[int]]]
) -> None:
    """Check that the generators satisfy no relation but the claimed orders.

    Raises `Inconsistent` naming the relation: dependent generators, or a torsion order that is wrong.
    """
    size = rank + len(orders)
    if size == 0:
        return
    basis, settled = vanishing_lattice(size, functionals)
    relations = true_relations(basis, settled)
    for row in relations:
        if any(row[:rank]):
            text = _combination(row, rank)
            what = f"generators: dependent, {text} = 0 in every group J(F_v) tried"
            raise Inconsistent(what, text, "independent generators")
    for j, order in enumerate(orders):
        name = f"torsion generator no. {j + 1}"
        for modulus, values in functionals:
            if order * values[rank + j] % modulus:
                what = f"{order} times it is not zero in a group J(F_v)"
                raise Inconsistent(f"{name}: not of order {order}, {what}", name, "its order")
    if orders:
        found = hermite([row[rank:] for row in relations]) if relations else []
        volume = 1
        for i, line in enumerate(found):
            volume *= line[i] if i < len(line) else 1
        claimed = 1
        for order in orders:
            claimed *= order
        if len(found) < len(orders) or volume != claimed:
            order_found = volume if len(found) == len(orders) else "unknown"
            raise Inconsistent(
                f"torsion: a group of order {order_found}, where the claimed orders give {claimed}",
                "torsion",
                "independent torsion generators with their orders",
            )


def _combination(row: Sequence[int], rank: int) -> str:
    """A combination of D1 .. Dr, T1 .. in the usual notation, its sign such that it starts without one."""
    text, leading = "", next((a for a in row if a), 1)
    for i, a in enumerate(row):
        a = a if leading > 0 else -a
        if a:
            name = f"D{i + 1}" if i < rank else f"T{i + 1 - rank}"
            sign = "" if not text else " - " if a < 0 else " + "
            text += sign + ("" if abs(a) == 1 else f"{abs(a)}*") + name
    return text


def point_coordinates(
    rank: int, orders: Sequence[int], functionals: Sequence[tuple[int, Sequence[int]]]
) -> PointCoordinates | None:
    """The coordinates of a class; its image is the last coefficient of every functional.

    Arguments: functionals on r + s + 1 coordinates.  Returns None when no relation of small height with the
    generators exists.
    """
    size = rank + len(orders) + 1
    basis, settled = vanishing_lattice(size, functionals)
    relations = true_relations(basis, settled)
    if not any(row[-1] for row in relations):
        return None
    # put the last coordinate first: the Hermite form then shows the least denominator
    form = hermite([[row[-1], *row[:-1]] for row in relations])
    lead = form[0]
    denominator = lead[0]
    vector = [-a for a in lead[1:]]
    torsion = [a % t for a, t in zip(vector[rank:], orders, strict=True)]
    free = vector[:rank]
    return PointCoordinates(
        tuple(free), tuple(torsion) if denominator == 1 else tuple(vector[rank:]), denominator
    )


@dataclass(frozen=True)
class PointBasis:
    """A basis of the group generated by given classes.

    `free` and `torsion`: generators as integer combinations of the classes; `orders` of the torsion
    generators; `coordinates`: for every class its free and torsion coordinates.
    """

    free: tuple[tuple[int, ...], ...]
    torsion: tuple[tuple[int, ...], ...]
    orders: tuple[int, ...]
    coordinates: tuple[tuple[tuple[int, ...], tuple[int, ...]], ...]


def basis_of_classes(size: int, functionals: Sequence[tuple[int, Sequence[int]]]) -> PointBasis:
    """A basis of the group generated by `size` classes, from their images in many J(F_v).

    The quotient of Z^size by the relations splits into a free part and torsion (Smith form); the free
    coordinates are made small over all classes together by lattice reduction.
    """
    basis, settled = vanishing_lattice(size, functionals)
    # in a form that depends on the lattice alone: the same basis whatever primes showed it
    relations = _lll(hermite(true_relations(basis, settled)))
    count = len(relations)
    diagonal, right = _smith(relations, size)
    # class of e_j: row j of `right`; coordinates with diagonal d > 1 are torsion, those past `count` are free
    torsion_places = [i for i in range(count) if diagonal[i] > 1]
    free_places = list(range(count, size))
    free = [[right[j][i] for j in range(size)] for i in free_places]
    if free:
        free = _lll(free)
    # generators: solve for combinations of the e_j with unit coordinates
    torsion_rows = [[right[j][i] for j in range(size)] for i in torsion_places]
    orders = [diagonal[i] for i in torsion_places]
    generators = [_preimage(free, torsion_rows, orders, k) for k in range(len(free) + len(orders))]
    coordinates = tuple(
        (
            tuple(row[j] for row in free),
            tuple(row[j] % d for row, d in zip(torsion_rows, orders, strict=True)),
        )
        for j in range(size)
    )
    return PointBasis(
        tuple(tuple(g) for g in generators[: len(free)]),
        tuple(tuple(g) for g in generators[len(free) :]),
        tuple(orders),
        coordinates,
    )


def _smith(relations: Sequence[Sequence[int]], size: int) -> tuple[list[int], list[list[int]]]:
    """Diagonal and right transform of a full-rank k x size matrix: relations * V = U * diag.

    Returns (d, V') where the class of e_j has coordinate V'[j][i] modulo d_i for i < k, and V'[j][i] in Z
    for i >= k.
    """
    rows = [list(row) for row in relations]
    k = len(rows)
    right = [[int(i == j) for j in range(size)] for i in range(size)]
    for step in range(k):
        while True:
            pivot = min(
                (abs(rows[i][j]), i, j) for i in range(step, k) for j in range(step, size) if rows[i][j]
            )
            _, i, j = pivot
            rows[step], rows[i] = rows[i], rows[step]
            for row in (*rows, *right):
                row[step], row[j] = row[j], row[step]
            p = rows[step][step]
            for i in range(step + 1, k):
                q = rows[i][step] // p
                rows[i] = [a - q * b for a, b in zip(rows[i], rows[step], strict=True)]
            for j in range(step + 1, size):
                q = rows[step][j] // p
                if q:
                    for row in (*rows, *right):
                        row[j] -= q * row[step]
            if any(rows[i][step] for i in range(step + 1, k)) or any(rows[step][step + 1 :]):
                continue
            bad = next((i for i in range(step + 1, k) if any(a % p for a in rows[i])), None)
            if bad is None:
                break
            rows[step] = [a + b for a, b in zip(rows[step], rows[bad], strict=True)]
    return [abs(rows[i][i]) for i in range(k)], right


def _preimage(
    free: Sequence[Sequence[int]], torsion: Sequence[Sequence[int]], orders: Sequence[int], which: int
) -> list[int]:
    """A short integer vector with (free, torsion mod orders) coordinates equal to the unit vector `which`."""
    size = len(free[0]) if free else len(torsion[0])
    rows = list(free) + list(torsion)
    count = len(rows)
    # kernel of (rows | orders | -target) by lattice reduction with a heavy weight on the equations
    weight = 10**12
    extra = len(orders)
    lattice = []
    for j in range(size):
        lattice.append([weight * row[j] for row in rows] + [int(i == j) for i in range(size)] + [0])
    for t in range(extra):
        vector = [0] * count
        vector[len(free) + t] = weight * orders[t]
        lattice.append(vector + [0] * size + [0])
    target = [0] * count
    target[which] = -weight
    lattice.append(target + [0] * size + [10**6])
    reduced = _lll(lattice)
    for row in reduced:
        if not any(row[:count]) and abs(row[-1]) == 10**6:
            sign = 1 if row[-1] > 0 else -1
            return [sign * a for a in row[count:-1]]
    raise Inconsistent("no short combination of the known points gives a generator", "known points")


__all__ = [
    "PointBasis",
    "PointCoordinates",
    "basis_of_classes",
    "generator_relations",
    "point_coordinates",
    "true_relations",
    "vanishing_lattice",
]
