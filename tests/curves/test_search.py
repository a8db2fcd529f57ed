"""Rational points found by the search against all triples of small height; lines and what they cut out."""

from __future__ import annotations

import random
from fractions import Fraction
from itertools import product
from math import gcd, isqrt

import pytest

from sieve.curves.divisors import ClosedPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.line_search import gradient, line_places
from sieve.curves.plane import PlaneCurve
from sieve.curves.search import by_height, points_over, search_points
from tests.support.planted_quartics import planted_quartic

HEIGHT = 12


def plane_points(curve: PlaneCurve, height: int) -> set[tuple[int, int, int]]:
    """All points with X, Z up to the height and Y up to 8 times it, one triple after the other."""
    found = set()
    small = range(-height, height + 1)
    for x, y, z in product(small, range(-8 * height, 8 * height + 1), small):
        if gcd(x, y, z) == 1 and (z or x or y) > 0 and curve.contains((x, y, z)):
            found.add((x, y, z))
    return found


@pytest.mark.parametrize("seed", range(6))
def test_plane_points_are_all_found(seed: int) -> None:
    curve, planted = planted_quartic(random.Random(seed))
    found = search_points(curve, HEIGHT)
    assert set(planted) <= set(found) and len(set(found)) == len(found)
    assert all(curve.contains(p) for p in found)
    # by x-coordinate: a point of small height has a small one
    assert plane_points(curve, 4) <= set(found)
    assert found == by_height(curve, found)


def test_points_with_denominators_in_y() -> None:
    """On 4 y^4 = x^4 + .. the y-coordinates have even denominators, over x of height 1."""
    curve = PlaneCurve({(0, 4, 0): 16, (4, 0, 0): -1, (1, 3, 0): 8, (0, 0, 4): -1, (1, 0, 3): 1})
    # x = 1: 16 y^4 + 8 y^3 = 1 - 1 + 1
    assert curve.contains((0, 1, 2)) and (0, 1, 2) in search_points(curve, 1)
    assert points_over(curve, Fraction(0)) == [(0, -1, 2), (0, 1, 2)]


def test_hyperelliptic_points_are_all_found() -> None:
    rng = random.Random(5)
    for _ in range(20):
        f = [rng.randint(-3, 3) for _ in range(6)] + [rng.choice([1, 4, -1, 0])]
        try:
            curve = HyperellipticCurve(f, [rng.randint(0, 1) for _ in range(3)])
        except ValueError:
            continue
        expected = set(points_over(curve, None))
        for a, b in product(range(-HEIGHT, HEIGHT + 1), range(1, HEIGHT + 1)):
            if gcd(a, b) == 1:
                # y solves a quadratic equation: its discriminant is a square
                h = sum(c * a**i * b ** (curve.weight - i) for i, c in enumerate(curve.h))
                value = sum(c * a**i * b ** (curve.degree - i) for i, c in enumerate(curve.square_form))
                root = isqrt(max(value, 0))
                if root * root == value and (root - h) % 2 == 0:
                    expected |= {(a, (root - h) // 2, b), (a, (-root - h) // 2, b)}
        assert set(search_points(curve, HEIGHT)) == expected


@pytest.mark.parametrize("seed", range(5))
def test_places_on_lines(seed: int) -> None:
    """Every place is on the curve, spans a line, and with points and places of higher degree fills it."""
    curve, planted = planted_quartic(random.Random(100 + seed))
    places = line_places(curve, planted, 1)
    assert len(places) == len(set(places)) and places
    for place in places:
        assert isinstance(place, ClosedPlace) and place.degree == 2
        again = curve.closed_point(place.u, place.x, place.y, place.z)
        assert again == place
        rows = [[*part, Fraction(0)][:2] for part in (place.x, place.y, place.z)]
        assert sum(any(row) for row in rows) >= 2


def test_bitangents_are_met_once() -> None:
    """x + y + z = 0 touches the quartic x^3 y + y^3 z + z^3 x in the points over Q(zeta_3)."""
    curve = PlaneCurve({(3, 1, 0): 1, (0, 3, 1): 1, (1, 0, 3): 1})
    third = Fraction(1)
    contact = curve.closed_point([third, third, third], [0, 1], [1], [-1, -1])
    found = line_places(curve, [(1, 0, 0), (0, 1, 0), (0, 0, 1)], 1)
    on_it = [p for p in found if same_points(p, contact)]
    assert len(on_it) == 1
    # the tangents at the three points are the axes
    tangents = [gradient(curve, p) for p in [(1, 0, 0), (0, 1, 0), (0, 0, 1)]]
    assert tangents == [(0, 1, 0), (0, 0, 1), (1, 0, 0)]


def same_points(p: ClosedPlace, q: ClosedPlace) -> bool:
    """Do both lie over the roots of s^2 + s + 1, s = X/Y?"""
    for place in (p, q):
        x, y = ([*part, 0, 0] for part in (place.x, place.y))
        norm = [0, 0, 0]
        for a, b in ((x, x), (x, y), (y, y)):
            norm[0] += a[0] * b[0]
            norm[1] += a[0] * b[1] + a[1] * b[0]
            norm[2] += a[1] * b[1]
        # a multiple of u
        if [c * place.u[2] for c in norm] != [norm[2] * c for c in place.u] or not norm[2]:
            return False
    return True
