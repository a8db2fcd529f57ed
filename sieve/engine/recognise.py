"""Which candidates are rational points: known points, rational reconstruction, exact check."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from fractions import Fraction
from math import lcm

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
    """Rational points from rational reconstruction of the candidate's coordinates, verified on the curve.

    One chart coordinate is enough near points with Z or X nonzero modulo p; near (0 : 1 : 0) both are used.
    Only points that agree with the candidate to all its digits are returned.
    """
    if candidate.kind != "point" or candidate.coordinates is None:
        return ()
    x, y, z = candidate.coordinates
    curve, points = place.curve, []
    if _is_unit(z):
        value = _rational(x, z)
        if value is not None:
            points = points_over(curve, value)
    elif _is_unit(x) or curve.weight > 1:
        # z/x is the small coordinate
        value = _rational(z, x)
        if value is not None:
            points = points_over(curve, 1 / value if value else None)
    else:
        left, right = _rational(x, y), _rational(z, y)
        if left is not None and right is not None:
            scale = lcm(left.denominator, right.denominator)
            point = (int(left * scale), scale, int(right * scale))
            if curve.contains(point):
                points = [curve.normalise(*map(Fraction, point))]
    return matching_points(place, candidate, dict.fromkeys(points), ())


def _is_unit(value: PadicNumber) -> bool:
    return not value.is_zero and value.valuation <= 0


def _rational(top: PadicNumber, bottom: PadicNumber) -> Fraction | None:
    if bottom.is_zero or bottom.valuation > 0:
        return None
    return (top * bottom.inverse()).rational_reconstruction()
