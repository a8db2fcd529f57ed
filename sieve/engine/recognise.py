"""Which candidates are rational points: known points, rational reconstruction, exact check."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from sieve.curves.divisors import Point
from sieve.curves.search import points_over
from sieve.engine.coordinates import PointCoordinates
from sieve.exact.padic_number import PadicNumber
from sieve.local.chabauty import ChabautyPlace, LocatedCandidate


def matching_points(
    place: ChabautyPlace,
    candidate: LocatedCandidate,
    points: Mapping[Point, PointCoordinates | None],
    orders: Sequence[int],
) -> tuple[Point, ...]:
    """The rational points (keys of `points`) that agree with the candidate to all its digits.

    Kind "point": same disc and parameter modulo p^digits; "disc": same disc; "coefficients": coordinates of
    the point, where known with denominator prime to p, agree (and torsion, and disc, where given).
    """
    p = place.prime
    out = []
    for point, coordinates in points.items():
        disc = place.integrals.disc_of(point)
        if candidate.kind == "coefficients":
            if coordinates is None or coordinates.denominator % p == 0:
                continue
            if candidate.disc is not None and candidate.disc != disc:
                continue
            if not all(
                c.agrees(f) for c, f in zip(candidate.coefficients, coordinates.coefficients, strict=True)
            ):
                continue
            if (
                candidate.torsion
                and coordinates.denominator == 1
                and any(
                    (a - b) % t
                    for a, b, t in zip(candidate.torsion, coordinates.torsion, orders, strict=True)
                )
            ):
                continue
            out.append(point)
        elif disc == candidate.disc:
            if candidate.kind == "disc":
                out.append(point)
                continue
            parameter, digits = place.integrals.parameter_of_point(point, candidate.digits)
            if (parameter - candidate.parameter) % p**digits == 0:
                out.append(point)
    return tuple(sorted(out))


def reconstruct(place: ChabautyPlace, candidate: LocatedCandidate) -> tuple[Point, ...]:
    """Rational points from rational reconstruction of the candidate's x-coordinate, verified on the curve.

    Only points that agree with the candidate to all its digits are returned.
    """
    if candidate.kind != "point" or candidate.coordinates is None:
        return ()
    x, _, z = candidate.coordinates
    points: list[Point] = []
    if z.is_zero or (z.digits > 0 and z.valuation > 0):
        # near infinity: z/x is the small coordinate
        inverse = _ratio(z, x)
        value = None if inverse is None else inverse.rational_reconstruction()
        if value is not None:
            points = list(points_over(place.curve, 1 / value if value else None))
    else:
        ratio = _ratio(x, z)
        value = None if ratio is None else ratio.rational_reconstruction()
        if value is not None:
            points = list(points_over(place.curve, value))
    return matching_points(place, candidate, dict.fromkeys(points), ())


def _ratio(a: PadicNumber, b: PadicNumber) -> PadicNumber | None:
    if b.is_zero or b.valuation > 0:
        return None
    return a * b.inverse()
