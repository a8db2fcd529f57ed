"""Points of plane curves over small fields, recognised from their digits in every chart."""

from __future__ import annotations

import random
from itertools import product

import flint
import pytest

from sieve.curves.line_search import line_places
from sieve.curves.plane import PlaneCurve
from sieve.engine.algebraic import recognise_algebraic
from sieve.exact.padic_number import PadicNumber
from tests.support.planted_quartics import planted_quartic


def root(coefficients, p: int, n: int) -> int | None:
    """A simple root modulo p^n of a polynomial with p-integral coefficients."""
    modulus = p**n
    c = [int(a.numerator * pow(a.denominator, -1, modulus)) for a in coefficients]
    for t in range(p):
        if sum(a * t**k for k, a in enumerate(c)) % p == 0:
            slope = sum(k * a * t ** (k - 1) for k, a in enumerate(c) if k)
            if slope % p:
                for _ in range(n):
                    value = sum(a * t**k for k, a in enumerate(c))
                    d = sum(k * a * t ** (k - 1) for k, a in enumerate(c) if k)
                    t = (t - value * pow(d, -1, modulus)) % modulus
                return t
    return None


@pytest.mark.parametrize("seed", range(8))
def test_quadratic_points_of_lines(seed: int) -> None:
    curve, planted = planted_quartic(random.Random(200 + seed))
    n, met = 24, 0
    for p, place in product((11, 13, 17), line_places(curve, planted, 1)[:20]):
        if any(c.denominator % p == 0 for c in place.u):
            continue
        t = root(place.u, p, n)
        if t is None:
            continue
        entries = [
            sum(c.numerator * pow(c.denominator, -1, p**n) * pow(t, k, p**n) for k, c in enumerate(part))
            for part in (place.x, place.y, place.z)
        ]
        if all(e % p == 0 for e in entries):
            continue
        scale = random.Random(seed).randrange(1, p)
        x, y, z = (PadicNumber.padic(p, scale * e, 0, n) for e in entries)
        found = recognise_algebraic(curve, p, (x, y, z))
        assert found is not None and found.degree == 2
        # the same field
        first = found.minimal[1] ** 2 - 4 * found.minimal[0] * found.minimal[2]
        second = place.u[1] ** 2 - 4 * place.u[0]
        quotient = first * second.numerator * second.denominator
        assert quotient > 0 and int(quotient) == int(flint.fmpz(int(quotient)).isqrt()) ** 2
        # another point of the disc is not recognised as the same
        assert recognise_algebraic(curve, p, (x, y + p, z)) is None
        met += 1
    assert met >= 1


def test_the_point_near_the_last_chart() -> None:
    """(t : 1 : 0) with t^2 = 5^2 * 2 is near (0 : 1 : 0) at 5 .. and at 7, where 2 is a square."""
    curve = PlaneCurve({(4, 0, 0): 1, (0, 4, 0): -4 * 49**2, (0, 0, 4): 1, (1, 0, 3): 1})
    # x^4 = 4 * 49^2 y^4 on z = 0: x^2 = 98 y^2
    t = 7 * int(root([flint.fmpz(-2), flint.fmpz(0), flint.fmpz(1)], 7, 20))
    x, y, z = (PadicNumber.padic(7, c, 0, 20) for c in (t, 1, 0))
    found = recognise_algebraic(curve, 7, (x, y, z))
    assert found is not None and str(found) == "(t : 1 : 0) with t^2 - 98 = 0"


def test_random_points_are_not_recognised() -> None:
    rng = random.Random(3)
    curve, _ = planted_quartic(rng)
    for _ in range(40):
        x, y, z = (PadicNumber.padic(7, rng.randrange(7**12), 0, 12) for _ in range(3))
        assert recognise_algebraic(curve, 7, (x, y, z)) is None
