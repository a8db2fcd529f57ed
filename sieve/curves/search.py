"""Rational points whose x-coordinate has small height, for every model: roots of F(a, Y, b)."""

from __future__ import annotations

from collections.abc import Iterable
from fractions import Fraction
from math import gcd

import flint
import numpy as np
from numpy.typing import NDArray

from sieve.curves.divisors import Point
from sieve.curves.protocol import Curve

_MODULI = (7, 11, 13, 16, 17, 19, 23, 27, 29, 31, 37, 41, 43, 47)


def by_height(curve: Curve, points: Iterable[Point]) -> list[Point]:
    """Points sorted by height, on y^2 + h y = f that of x; then by value."""
    plane = curve.weight == 1
    return sorted(points, key=lambda p: (max(abs(p[0]), abs(p[2]), abs(p[1]) if plane else 0), p))


def points_over(curve: Curve, x: Fraction | None) -> list[Point]:
    """The rational points above a rational x = X/Z, or those with Z = 0 (None); exact, sorted."""
    a, b = (1, 0) if x is None else (x.numerator, x.denominator)
    found = set()
    for y in _rational_roots(_fibre(curve, a, b)):
        found.add(curve.normalise(Fraction(a), y, Fraction(b)))
    if x is None and curve.weight == 1 and curve.contains((0, 1, 0)):
        found.add((0, 1, 0))
    return sorted(found)


def _fibre(curve: Curve, a: int, b: int) -> list[int]:
    """F(a, Y, b) as a polynomial in Y, low degree first."""
    w, degree = curve.weight, curve.degree
    return [
        sum(c * a**i * b ** (degree - w * k - i) for i, c in enumerate(row) if c)
        for k, row in enumerate(curve.rows)
    ]


def _rational_roots(coefficients: list[int]) -> list[Fraction]:
    _, factors = flint.fmpz_poly(coefficients).factor()
    linear = [q.coeffs() for q, _ in factors if q.degree() == 1]
    return [Fraction(-int(low), int(top)) for low, top in linear]


def search_points(curve: Curve, height: int) -> list[Point]:
    """All rational points with x = a/b, |a|, b <= height, and those with Z = 0; sorted by height.

    Arguments: `height` >= 1, at most 10^6. Tables say for which a, b modulo small prime powers F(a, Y, b)
    can have a root; what they leave is solved exactly. Cost about 2 height^2 look-ups.
    """
    tables = [(m, _table(curve, m)) for m in _MODULI]
    numerators = np.arange(-height, height + 1, dtype=np.int64)
    found: set[Point] = set(points_over(curve, None))
    for b in range(1, height + 1):
        left = numerators
        for m, table in tables:
            left = left[table[b % m][left % m]]
        for a in left.tolist():
            if gcd(a, b) == 1:
                found.update(points_over(curve, Fraction(a, b)))
    return by_height(curve, found)


def _table(curve: Curve, m: int) -> NDArray[np.bool_]:
    """For b, a modulo m: can F(a, Y, b) have a rational root?  Int64, all products below m^2.

    A root with denominator prime to m is one modulo m; another needs a leading coefficient that is no unit.
    """
    w, degree = curve.weight, curve.degree
    everyone = np.arange(m, dtype=np.int64)
    powers = np.ones((degree + 1, m), dtype=np.int64)
    for i in range(1, degree + 1):
        powers[i] = powers[i - 1] * everyone % m
    rows = np.zeros((len(curve.rows), m, m), dtype=np.int64)
    for k, row in enumerate(curve.rows):
        for i, c in enumerate(row):
            if c:
                rest = degree - w * k - i
                rows[k] = (rows[k] + c % m * powers[rest][:, None] % m * powers[i][None, :]) % m
    value = np.zeros((m, m, m), dtype=np.int64)
    for row in rows[::-1]:
        value = (value * everyone + row[:, :, None]) % m
    possible: NDArray[np.bool_] = (value == 0).any(axis=2) | (np.gcd(rows[-1], m) > 1)
    return possible
