"""Points over small fields recognised from their digits, and random points that are none."""

from __future__ import annotations

import random
from fractions import Fraction

import pytest

from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.engine.algebraic import recognise_algebraic, small_polynomial
from sieve.exact.padic_number import PadicNumber


def root_of(polynomial, p, n, near):
    """The root modulo p^n of an integer polynomial (low degree first) that is `near` modulo p."""
    q, x = p**n, near
    for _ in range(n):
        value = sum(c * x**k for k, c in enumerate(polynomial))
        slope = sum(k * c * x ** (k - 1) for k, c in enumerate(polynomial) if k)
        x = (x - value * pow(slope, -1, q)) % q
    return x


def point(p, n, x, y, z=1):
    return tuple(PadicNumber.padic(p, c, 0, n) for c in (x, y, z))


def test_gaussian_point():
    """On y^2 = x^6 + x^2 + 1 lies (i, i): i^6 + i^2 + 1 = -1 = i^2."""
    curve = HyperellipticCurve([1, 0, 1, 0, 0, 0, 1])
    i = root_of([1, 0, 1], 5, 10, 2)
    for sign in (1, -1):
        found = recognise_algebraic(curve, 5, point(5, 10, i, sign * i))
        assert found is not None and found.minimal == (1, 0, 1) and found.y == (0, sign)
    assert str(found) == "(t, -t) with t^2 + 1 = 0"
    # the wrong y is on no such point
    assert recognise_algebraic(curve, 5, point(5, 10, i, i + 5)) is None


def test_rational_x_with_quadratic_y():
    """y^2 = 69 over x = 2 on the same curve, in the user's scale too."""
    curve = HyperellipticCurve([1, 0, 1, 0, 0, 0, 1])
    y = root_of([-69, 0, 1], 5, 10, 2)
    found = recognise_algebraic(curve, 5, point(5, 10, 2, y))
    assert found is not None and str(found) == "(2, t) with t^2 - 69 = 0" and found.x == 2


def test_point_near_infinity_and_a_middle_term():
    """y^2 + y = f built so that (1/t, ..) with t^2 = 98 lies on it, near infinity at 7."""
    # at x = 1/t, t^2 = 98: y = x^3 * (t + 1) in the chart; take f = y0^2 + y0 + (98 x^2 - 1) * (x^4 + 3)
    # with y0 = x^2 + x^3
    f = [0] * 7
    y0 = [0, 0, 1, 1]
    for a, c in enumerate(y0):
        f[a] += c
        for b, d in enumerate(y0):
            f[a + b] += c * d
    for a, c in ((0, -1), (2, 98)):
        for b, d in ((0, 3), (4, 1)):
            f[a + b] += c * d
    curve = HyperellipticCurve(f, [1])
    n = 14
    p = 7
    root2 = root_of([-2, 0, 1], p, n, 3)
    w = 7 * root2 % p**n
    # y = x^2 + x^3, in the chart at infinity y / x^3 = w + 1
    found = recognise_algebraic(curve, p, point(p, n, 1, w + 1, w))
    assert found is not None and found.inverted and found.minimal == (-98, 0, 1)
    # y = 1/t^2 + 1/t^3 = 1/98 + t/98^2
    assert found.y == (Fraction(1, 98), Fraction(1, 9604))


@pytest.mark.parametrize("p, n", [(3, 6), (5, 6), (7, 6), (11, 8)])
def test_random_points_are_not_recognised(p, n):
    rng = random.Random(p)
    curve = HyperellipticCurve([1, -4, 2, -2, 1, 2, 1])
    found = [recognise_algebraic(curve, p, point(p, n, rng.randrange(p**n), rng.randrange(p**n)))
             for _ in range(150)]
    assert sum(f is not None for f in found) == 0


def test_small_polynomials():
    q = 11**8
    cubic = [-2, 0, 0, 1]
    assert small_polynomial(root_of(cubic, 11, 12, 7), 11**12, 3) in ((-2, 0, 0, 1), (2, 0, 0, -1))
    assert small_polynomial(123456789, q, 2) is None


def test_the_scale_of_the_coordinates_does_not_matter():
    """(i, i) on y^2 = x^6 + x^2 + 1 as (3 i : 27 i : 3), weights 1, 3, 1."""
    curve = HyperellipticCurve([1, 0, 1, 0, 0, 0, 1])
    i = root_of([1, 0, 1], 5, 12, 2)
    once = recognise_algebraic(curve, 5, point(5, 12, i, i))
    assert once is not None and recognise_algebraic(curve, 5, point(5, 12, 3 * i, 27 * i, 3)) == once
    # (-2/9, 241/243) lies on this curve over Q, no point with x = -2 does
    rational = HyperellipticCurve([1, 0, 0, 1, -2, 1])
    assert str(recognise_algebraic(rational, 5, point(5, 12, -2, 723, 9))).find("71") < 0
