"""Rational points of small height on y^2 + h(x) y = f(x)."""

from __future__ import annotations

from fractions import Fraction
from math import gcd, isqrt

import numpy as np
from numpy.typing import NDArray

from sieve.curves.divisors import Point
from sieve.curves.hyperelliptic import HyperellipticCurve

_MODULI = (64, 9 * 5 * 7, 11 * 13, 17 * 19, 23 * 29)


def points_over(curve: HyperellipticCurve, x: Fraction | None) -> list[Point]:
    """The rational points above a rational x, or at infinity (None); exact, sorted."""
    g = curve.genus
    a, b = (1, 0) if x is None else (x.numerator, x.denominator)
    square = _form(curve.square_form, 2 * g + 2, a, b)
    if square < 0 or isqrt(square) ** 2 != square:
        return []
    root = isqrt(square)
    middle = _form(curve.h, g + 1, a, b)
    out = {(a, (s * root - middle) // 2, b) for s in (1, -1) if (s * root - middle) % 2 == 0}
    return sorted(p for p in out if curve.contains(p))


def _form(coefficients: tuple[int, ...], degree: int, a: int, b: int) -> int:
    return sum(c * a**i * b ** (degree - i) for i, c in enumerate(coefficients))


def search_points(curve: HyperellipticCurve, height: int) -> list[Point]:
    """All rational points with x = a/b, |a|, b <= height, and those at infinity; by height of x, then value.

    Arguments: `height` >= 1, at most 10^6.  Residues of 4 f + h^2 modulo five small moduli sift the
    x-coordinates (int64, all products below 2^20); what is left is tested exactly.  Cost about 2 height^2
    residue evaluations.
    """
    degree = 2 * curve.genus + 2
    tables = [(m, _square_table(m), [c % m for c in curve.square_form]) for m in _MODULI]
    numerators = np.arange(-height, height + 1, dtype=np.int64)
    found: list[Point] = list(points_over(curve, None))
    for b in range(1, height + 1):
        left = numerators
        for m, squares, coefficients in tables:
            value = np.zeros_like(left)
            residue = left % m
            power = 1
            # sum c_i a^i b^(degree - i), from the top down
            for i in range(degree, -1, -1):
                c = coefficients[i] if i < len(coefficients) else 0
                value = (value * residue + c * power) % m
                power = power * b % m
            left = left[squares[value]]
        for a in left.tolist():
            if gcd(a, b) == 1:
                found.extend(points_over(curve, Fraction(a, b)))
    return sorted(found, key=lambda p: (max(abs(p[0]), abs(p[2])), p))


def _square_table(m: int) -> NDArray[np.bool_]:
    table = np.zeros(m, dtype=bool)
    table[[a * a % m for a in range(m)]] = True
    return table
