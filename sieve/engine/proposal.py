"""A base divisor and generators for a curve, from rational points and closed points of small degree.

What is proposed are divisors; that they generate a subgroup of finite index, and of which index, is checked
later like for any others.
"""

from __future__ import annotations

from collections.abc import Sequence
from concurrent.futures import Executor
from dataclasses import dataclass
from itertools import combinations

from flint import fmpz_mat

from sieve.curves.base_search import base_from, closed_points, difference_from
from sieve.curves.divisors import ClosedPlace, Divisor, FibrePlace, MumfordPlace, Place, Point, RationalPlace
from sieve.curves.line_search import line_places
from sieve.curves.protocol import Curve
from sieve.curves.search import search_points
from sieve.engine.coordinates import PointBasis, basis_of_classes
from sieve.engine.hypotheses import saturation
from sieve.errors import LimitReached
from sieve.exact.primes import primes_below
from sieve.local.records import local_records

PRIMES_BELOW = 150
"""Auxiliary primes that tell the relations between the divisors found."""
USED = 12
"""At most so many places are combined."""
JOINED = 10
"""So many rational points are joined by lines."""
SEARCH_HEIGHT = 200
SMALL_ELLS = (2, 3, 5)
"""Primes at which the group found should be saturated before the search stops."""


@dataclass(frozen=True)
class Proposal:
    """What a bounded search found.

    `points`, rational points; `base` of degree 1, or one fibre (of which half is meant) when no divisor of
    degree 1 was found; `generators`, independent as far as the auxiliary primes tell; `torsion`, pairs
    (order, divisor); `size`, the bound of the last search; `unsaturated`, the primes among `SMALL_ELLS` at
    which the group they generate is not proved saturated (all of them when the rank is not reached).
    """

    points: tuple[Point, ...]
    base: Divisor
    generators: tuple[Divisor, ...]
    torsion: tuple[tuple[int, Divisor], ...]
    size: int
    unsaturated: tuple[int, ...]


def propose(
    curve: Curve, rank: int | None, largest: int = 4, executor: Executor | None = None
) -> Proposal:
    """Search until `rank` independent divisors that generate a group saturated at small primes are found.

    The closed points are those on curves y = c(x)/d or, on a plane curve, on lines. With rational points a
    small search comes first; the last one has the bound `largest`.

    Arguments: `rank`, the number of generators wanted (None: whatever `largest` gives).  A proposal with
    fewer generators proves nothing.  Raises `LimitReached` for a plane curve without a known rational point.

    >>> from sieve.curves.hyperelliptic import HyperellipticCurve
    >>> proposal = propose(HyperellipticCurve([2, 0, -1, 0, -3, 0, -3]), 1)
    >>> proposal.points, proposal.base.degree, len(proposal.generators), proposal.torsion
    ((), 2, 1, ())
    """
    points = tuple(search_points(curve, SEARCH_HEIGHT))
    # lines are cheap to try
    size = 1 if points and curve.weight > 1 else largest
    closed = _closed(curve, points, size)
    if points:
        base = Divisor.of([(1, RationalPlace(points[0]))])
    else:
        base = _base_without_points(curve, closed)
    while True:
        for used in (USED, 2 * USED):
            places: list[Place] = [RationalPlace(p) for p in points[1:used]]
            places += [p for p in closed if p.degree > 1][: used - len(places)]
            found = _basis(curve, points, base, places, rank, size, executor)
            reached = rank is not None and len(found.generators) >= rank
            if (reached and not found.unsaturated) or len(places) < used:
                break
        if (reached and not found.unsaturated) or size == largest:
            return found
        size = largest
        closed = _closed(curve, points, size)


def _closed(curve: Curve, points: Sequence[Point], size: int) -> list[MumfordPlace | ClosedPlace]:
    """Closed points of small degree, those on lines for a plane curve."""
    if curve.weight == 1:
        return [*line_places(curve, points[:JOINED], size)]
    return [*closed_points(curve, size)]


def _base_without_points(curve: Curve, closed: Sequence[MumfordPlace | ClosedPlace]) -> Divisor:
    """A divisor of degree 1 from a closed point of odd degree, or a fibre of the map to the x-line."""
    if curve.weight == 1:
        raise LimitReached("the search for a base divisor of degree 1", f"points of height {SEARCH_HEIGHT}")
    odd = [p for p in closed if isinstance(p, MumfordPlace) and p.degree % 2]
    return base_from(odd[0]) if odd else Divisor.of([(1, FibrePlace(1))])


def _basis(
    curve: Curve, points: tuple[Point, ...], base: Divisor, places: Sequence[Place],
    rank: int | None, size: int, executor: Executor | None,
) -> Proposal:
    divisors = []
    for place in places:
        if isinstance(place, RationalPlace):
            divisors.append(curve.difference(place.point, base))
        elif not isinstance(place, FibrePlace):
            divisor = (
                Divisor.of([(1, place)]) - place.degree * base
                if isinstance(place, ClosedPlace)
                else difference_from(place, base)
            )
            if divisor.terms:
                divisors.append(divisor)
    if not divisors:
        return Proposal(points, base, (), (), size, SMALL_ELLS)
    primes = primes_below(PRIMES_BELOW)
    records = [r for r in local_records(curve, base, divisors, primes, executor) if r.usable]
    functionals = []
    for record in records:
        for j, d in enumerate(record.invariants):
            functionals.append((d, [image[j] for image in record.images]))
    basis = basis_of_classes(len(divisors), functionals)
    rows = [*basis.free, *basis.torsion]
    images = [
        tuple(
            tuple(sum(a * image[j] for a, image in zip(row, r.images, strict=True)) % d
                  for j, d in enumerate(r.invariants))
            for row in rows
        )
        for r in records
    ]
    two = curve.two_torsion_dimension()
    unsaturated = tuple(
        ell for ell in SMALL_ELLS
        if len(basis.free) != rank
        or not saturation(ell, len(basis.free), basis.orders, records, images, two).proved
    )

    def combined(row: Sequence[int]) -> Divisor:
        total = Divisor(())
        for a, divisor in zip(row, divisors, strict=True):
            if a:
                total = total + a * divisor
        return total

    free = _single(basis)
    generators = [divisors[j] for j in free] or [combined(row) for row in basis.free]
    return Proposal(
        points, base, tuple(generators),
        tuple((d, combined(row)) for d, row in zip(basis.orders, basis.torsion, strict=True)), size,
        unsaturated,
    )


def _single(basis: PointBasis) -> list[int]:
    """The first divisors that are themselves free generators, up to torsion (none when there are no such)."""
    rank = len(basis.free)
    for chosen in combinations(range(len(basis.coordinates)), rank):
        matrix = fmpz_mat([list(basis.coordinates[j][0]) for j in chosen]) if rank else fmpz_mat(0, 0)
        if abs(int(matrix.det())) == 1:
            return list(chosen)
    return []

