"""Closed points of small degree on a smooth plane curve: what lines cut out besides rational points.

Lines through two known points and tangents at known points leave the fewest other zeros (for a quartic two, a
closed point of degree 2 or two rational points); lines with small coefficients find bitangents and other
closed points.
"""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction
from itertools import combinations, product
from math import gcd

import flint

from sieve.curves.divisors import ClosedPlace, Point
from sieve.curves.protocol import Curve

Line = tuple[int, int, int]


def line_places(curve: Curve, points: Sequence[Point], size: int) -> list[ClosedPlace]:
    """Closed points of degree 2 to degree - 2 on lines, without repetition.

    Arguments: known points, the first of which are joined by lines; `size` >= 0, a bound for the
    coefficients of other lines. The search is bounded: an empty list proves nothing. Sorted by degree, then
    by size. Cost: a factorisation for each line.
    """
    lines: dict[Line, None] = {}
    for p in points:
        lines[_primitive(gradient(curve, p))] = None
    for p, q in combinations(points, 2):
        lines[_primitive(_cross(p, q))] = None
    for coefficients in product(range(-size, size + 1), repeat=3):
        if any(coefficients):
            a, b, c = coefficients
            lines[_primitive((a, b, c))] = None
    found: dict[ClosedPlace, None] = {}
    for line in lines:
        for place in _on_line(curve, line):
            found[place] = None
    return sorted(found, key=lambda place: (place.degree, _height(place), place))


def gradient(curve: Curve, point: Point) -> Line:
    """The partial derivatives of F at a point of the plane: the tangent there, when it is on the curve."""
    x, y, z = point
    out = [0, 0, 0]
    for k, row in enumerate(curve.rows):
        for i, c in enumerate(row):
            j = curve.degree - i - k
            for place, exponent in enumerate((i, k, j)):
                if c and exponent:
                    e = [i, k, j]
                    e[place] -= 1
                    out[place] += c * exponent * x ** e[0] * y ** e[1] * z ** e[2]
    return out[0], out[1], out[2]


def _cross(p: Point, q: Point) -> Line:
    return p[1] * q[2] - p[2] * q[1], p[2] * q[0] - p[0] * q[2], p[0] * q[1] - p[1] * q[0]


def _primitive(line: Line) -> Line:
    """Coprime coefficients, the first nonzero one positive."""
    content = gcd(*line)
    sign = next((1 if c > 0 else -1 for c in line if c), 1)
    a, b, c = (sign * c // content for c in line)
    return a, b, c


def _on_line(curve: Curve, line: Line) -> list[ClosedPlace]:
    """The closed points of degree 2 .. degree - 2 on a line; none where it does not leave that many."""
    a, b, c = line
    # two points that span the line; t runs over start + t * step
    start, step = ((0, c, -b), (-c, 0, a)) if c else ((0, 0, 1), (-b, a, 0))
    if not any(start):
        start, step = (0, 1, 0), (-1, 0, 0)
    x, y, z = (flint.fmpz_poly([s, d]) for s, d in zip(start, step, strict=True))
    form = flint.fmpz_poly([0])
    for k, row in enumerate(curve.rows):
        for i, coefficient in enumerate(row):
            if coefficient:
                form += coefficient * x**i * y**k * z ** (curve.degree - i - k)
    out = []
    for factor, _ in form.factor()[1]:
        if 2 <= factor.degree() <= curve.degree - 2:
            lead = int(factor.coeffs()[-1])
            u = [Fraction(int(e), lead) for e in factor.coeffs()]
            entries = [[Fraction(s), Fraction(d)] for s, d in zip(start, step, strict=True)]
            place = curve.closed_point(u, *entries)
            if isinstance(place, ClosedPlace):
                out.append(place)
    return out


def _height(place: ClosedPlace) -> int:
    parts = place.u + place.x + place.y + place.z
    return max(max(abs(c.numerator), c.denominator) for c in parts)
