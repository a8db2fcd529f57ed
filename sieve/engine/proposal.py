"""A base divisor and generators for a curve, from rational points and closed points of small degree.

What is proposed are divisors; that they generate a subgroup of finite index, and of which index, is checked
later like for any others.
"""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from dataclasses import dataclass

from sieve.curves.base_search import base_from, closed_points, difference_from
from sieve.curves.divisors import Divisor, FibrePlace, Place, Point, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.search import search_points
from sieve.engine.coordinates import basis_of_classes
from sieve.exact.primes import primes_below
from sieve.local.records import local_records

PRIMES_BELOW = 150
"""Auxiliary primes that tell the relations between the divisors found."""
USED = 12
"""At most so many places are combined."""
SEARCH_HEIGHT = 200


@dataclass(frozen=True)
class Proposal:
    """What a bounded search found.

    `points`, rational points; `base` of degree 1, or one fibre (of which half is meant) when no divisor of
    degree 1 was found; `generators`, independent as far as the auxiliary primes tell; `torsion`, pairs
    (order, divisor); `size`, the bound of the last search.
    """

    points: tuple[Point, ...]
    base: Divisor
    generators: tuple[Divisor, ...]
    torsion: tuple[tuple[int, Divisor], ...]
    size: int


def propose(
    curve: HyperellipticCurve, rank: int | None, largest: int = 4, executor: Executor | None = None
) -> Proposal:
    """Search with growing bounds until `rank` independent divisors are found, or up to `largest`.

    Arguments: `rank`, the number of generators wanted (None: whatever `largest` gives).  A proposal with
    fewer generators proves nothing.

    >>> proposal = propose(HyperellipticCurve([2, 0, -1, 0, -3, 0, -3]), 1)
    >>> proposal.points, proposal.base.degree, len(proposal.generators), proposal.torsion
    ((), 2, 1, ())
    """
    points = tuple(search_points(curve, SEARCH_HEIGHT))
    half = Divisor.of([(1, FibrePlace(1))])
    found = Proposal(points, half, (), (), 0)
    for size in range(1, largest + 1):
        closed = closed_points(curve, size)
        odd = [p for p in closed if p.degree % 2]
        if points:
            base = Divisor.of([(1, RationalPlace(points[0]))])
        elif odd:
            base = base_from(odd[0])
        else:
            base = half
        places: list[Place] = [RationalPlace(p) for p in points[1:USED]]
        places += [p for p in closed if p.degree > 1][: USED - len(places)]
        found = _basis(curve, points, base, places, size, executor)
        if rank is not None and len(found.generators) >= rank and (points or odd or size == largest):
            break
    return found


def _basis(
    curve: HyperellipticCurve, points: tuple[Point, ...], base: Divisor, places: Sequence[Place], size: int,
    executor: Executor | None,
) -> Proposal:
    divisors = []
    for place in places:
        if isinstance(place, RationalPlace):
            divisors.append(curve.difference(place.point, base))
        elif not isinstance(place, FibrePlace):
            divisor = difference_from(place, base)
            if divisor.terms:
                divisors.append(divisor)
    if not divisors:
        return Proposal(points, base, (), (), size)
    functionals = []
    for record in local_records(curve, base, divisors, primes_below(PRIMES_BELOW), executor):
        if record.usable:
            for j, d in enumerate(record.invariants):
                functionals.append((d, [image[j] for image in record.images]))
    basis = basis_of_classes(len(divisors), functionals)

    def combined(row: Sequence[int]) -> Divisor:
        total = Divisor(())
        for a, divisor in zip(row, divisors, strict=True):
            if a:
                total = total + a * divisor
        return total

    return Proposal(
        points, base, tuple(combined(row) for row in basis.free),
        tuple((d, combined(row)) for d, row in zip(basis.orders, basis.torsion, strict=True)), size,
    )
