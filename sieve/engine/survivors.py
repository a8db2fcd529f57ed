"""Surviving classes as short vectors, and the barrier that an unknown rational point has to pass.

L = Z^r (+) T with torsion generators of orders t_1..t_s is held as Z^(r + s), free coordinates first.  Norms
are Euclidean norms of the free coordinates; torsion coordinates weigh nothing and are reduced to 0..t_j - 1.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import isqrt

from sieve.engine.relation import Relation
from sieve.errors import Inconsistent
from sieve.exact.lattice import Cosets, Found, ReducedLattice, Vector, kernel_lattice


@dataclass(frozen=True)
class Survivor:
    """A class by a short representative: all coordinates, squared norm of the free ones, labels if any.

    `exact`: the representative is proved shortest; otherwise it comes from rounding in a reduced basis.
    """

    vector: Vector
    norm: int
    exact: bool
    labels: tuple[str, ...] = ()


@dataclass(frozen=True)
class Barrier:
    """A proved lower bound for the norm of the coefficient vector of an unknown rational point.

    Fields: `norm`, the squared bound, and `value`, the integer part of its root (both None when no class is
    left, so that there is no unknown point); `vector`, a shortest vector that attains it; `explained`,
    whether it lies in the class of a known point; `open_classes`, the number of classes without a known
    point.
    """

    norm: int | None
    vector: Vector | None
    explained: bool
    open_classes: int

    @property
    def value(self) -> int | None:
        """The integer part of the bound."""
        return None if self.norm is None else isqrt(self.norm)


class ClassVectors:
    """Short representatives of the classes of L/K for one subgroup K.

    Arguments: a relation over Z^n; the orders of the torsion generators (the last coordinates of Z^n).
    Raises: Inconsistent when K does not contain t_j times the j-th torsion generator (a wrong torsion order).
    """

    def __init__(self, relation: Relation, torsion: Sequence[int] = ()) -> None:
        self.relation = relation
        self.torsion = tuple(torsion)
        self.rank = relation.n - len(self.torsion)
        for j, order in enumerate(self.torsion):
            vector = [0] * relation.n
            vector[self.rank + j] = order
            if any(any(part.values(vector)) for part in relation.parts):
                raise Inconsistent(f"torsion generator {j + 1} does not have order {order}", str(j + 1))
        self.cosets = Cosets(relation.n, relation.parts)
        # free columns come first, so the Hermite rows with zero free part span K cap T
        kernel = kernel_lattice(relation.n, relation.parts) if relation.parts else [
            tuple(int(i == j) for j in range(relation.n)) for i in range(relation.n)]
        self.free_rows, self.torsion_rows = kernel[:self.rank], kernel[self.rank:]
        self.free = ReducedLattice([row[:self.rank] for row in self.free_rows])
        size = 1
        for j, row in enumerate(self.torsion_rows):
            size *= row[self.rank + j]
        total = 1
        for order in self.torsion:
            total *= order
        #: whether a free part determines the torsion part within a class
        self.torsion_seen = size == total

    def complete(self, start: Vector, free: Vector) -> Vector:
        """The vector of the class of `start` with the given free part and the smallest torsion part."""
        out = list(start)
        for i, row in enumerate(self.free_rows):
            factor, rest = divmod(free[i] - out[i], row[i])
            assert rest == 0
            out = [a + factor * b for a, b in zip(out, row, strict=True)]
        for j, row in enumerate(self.torsion_rows):
            factor = out[self.rank + j] // row[self.rank + j]
            out = [a - factor * b for a, b in zip(out, row, strict=True)]
        return tuple(out)

    def start(self, place: int) -> Vector:
        """Some vector of the class in row `place` of the relation."""
        return self.cosets.lift([int(c) for c in self.relation.codes[place]])

    def survivor(self, place: int, exact: bool = True) -> Survivor:
        """The class in row `place` of the relation."""
        start = self.start(place)
        if exact:
            found = self.free.shortest(start[:self.rank])
            assert found is not None
        else:
            free = self.free.reduce(start[:self.rank])
            found = Found(sum(x * x for x in free), free)
        labels: tuple[str, ...] = ()
        if self.relation.tags is not None:
            labels = self.relation.label_sets[int(self.relation.tags[place])]
        return Survivor(self.complete(start, found.vector), found.norm, exact, labels)


def short_vectors(relation: Relation, torsion: Sequence[int] = (),
                  exact_limit: int = 20_000) -> list[Survivor]:
    """The classes of a relation as short vectors, shortest first.

    Arguments: a relation over Z^n; the orders of the torsion generators (last coordinates); a limit, see
    below. Proved shortest (exact enumeration) if the rank is at most 7 and there are at most `exact_limit`
    classes.
    """
    vectors = ClassVectors(relation, torsion)
    exact = vectors.rank <= 7 and relation.count <= exact_limit
    found = [vectors.survivor(place, exact) for place in range(relation.count)]
    return sorted(found, key=lambda s: (s.norm, s.vector))


def barrier(relation: Relation, known: Sequence[Sequence[int]], torsion: Sequence[int] = ()) -> Barrier:
    """The least norm of a vector in the classes of a relation that is not one of the known ones.

    Arguments: a relation whose classes contain the coefficient vectors of all rational points (no labels
    needed); the vectors of the known rational points, of length n; the torsion orders. Method: minimum over
    the shortest vectors of the classes without a known vector and, in classes with known vectors, over the
    shortest vectors apart from those; exact enumeration, integer comparison.  Where the relation cannot tell
    torsion elements apart, another point may have the free part of a known one, and the known free parts
    count as well. Raises: Inconsistent when the class of a known vector is missing.
    """
    vectors = ClassVectors(relation, torsion)
    rank = vectors.rank
    where = {tuple(int(c) for c in row): place for place, row in enumerate(relation.codes)}
    inside: dict[int, set[Vector]] = {}
    for vector in known:
        codes = tuple(c for part in relation.parts for c in part.values(vector))
        if codes not in where:
            shown = str(tuple(int(x) for x in vector))
            raise Inconsistent(f"the class of the known vector {shown} is excluded", shown)
        inside.setdefault(where[codes], set()).add(tuple(int(x) for x in vector[:rank]))
    best: tuple[int, Vector, bool] | None = None
    # classes of known points last: by then the bound is small and the search short
    for place in sorted(range(relation.count), key=lambda k: (k in inside, k)):
        start = vectors.start(place)
        exclude = inside.get(place, set()) if vectors.torsion_seen else set()
        found = vectors.free.shortest(start[:rank], exclude, None if best is None else best[0])
        if found is not None and (best is None or found.norm < best[0]):
            best = (found.norm, vectors.complete(start, found.vector), place in inside)
    open_classes = relation.count - len(inside)
    if best is None:
        return Barrier(None, None, False, open_classes)
    return Barrier(best[0], best[1], best[2], open_classes)


__all__ = ["Barrier", "ClassVectors", "Survivor", "barrier", "short_vectors"]
