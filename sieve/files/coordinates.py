"""Weighted coordinates (X : Y : Z), weights 1, w, 1, of points as files write them, for every model.

On y^2 + h y = f, w = g + 1 and X, Z are never both zero; on a plane curve w = 1 and X, Y, Z are never all
zero.
"""

from __future__ import annotations

from fractions import Fraction

from sieve.curves.notation import ParsedPoint
from sieve.curves.protocol import Curve
from sieve.exact.padic_number import PadicNumber

PadicPoint = tuple[PadicNumber, PadicNumber, PadicNumber]


def chart_coordinates(curve: Curve) -> tuple[int, ...]:
    """Which coordinates can be made 1, in the order of preference: Z, X and, on a plane curve, Y."""
    return (2, 0, 1) if curve.weight == 1 else (2, 0)


def zeros_text(curve: Curve) -> str:
    """What no point of the curve fulfils."""
    return "X = Y = Z = 0" if curve.weight == 1 else "X = Z = 0"


def nonzero_text(curve: Curve) -> str:
    """What every point of the curve fulfils."""
    return "X, Y or Z nonzero" if curve.weight == 1 else "X or Z nonzero"


def weighted(point: ParsedPoint[PadicNumber], weight: int) -> PadicPoint:
    """Three coordinates; Z = 1 for affine ones, to more digits than any operation on x and y can use."""
    if not point.affine:
        x, y, z = point.entries
        return x, y, z
    x, y = point.entries
    digits = max(1, *(c.precision + abs(c.valuation) for c in (x, y))) + weight * abs(x.valuation)
    return x, y, PadicNumber.padic(x.prime, 1, 0, digits)


def scaled(weight: int, point: PadicPoint, low: int) -> PadicPoint:
    """The same point with X and Z divided by p^low, Y by p^(weight * low)."""
    x, y, z = point
    unit = Fraction(x.prime) ** -low
    return x * unit, y * unit**weight, z * unit


def form_value(curve: Curve, point: PadicPoint) -> PadicNumber:
    """F(X, Y, Z), F the weighted form of the curve."""
    prime, precision = point[0].prime, max(c.precision for c in point)
    one = PadicNumber.padic(prime, 1, 0, precision)
    powers = [[one], [one], [one]]
    for row, entry, top in zip(powers, point, (curve.degree, len(curve.rows) - 1, curve.degree), strict=True):
        for _ in range(top):
            row.append(row[-1] * entry)
    total = PadicNumber.zero(prime, precision)
    for k, coefficients in enumerate(curve.rows):
        for i, c in enumerate(coefficients):
            if c:
                rest = curve.degree - i - curve.weight * k
                total = total + c * powers[0][i] * powers[1][k] * powers[2][rest]
    return total


def residue_value(curve: Curve, point: tuple[int, int, int], modulus: int) -> int:
    """F(X, Y, Z) modulo an integer."""
    x, y, z = point
    total = 0
    for k, coefficients in enumerate(curve.rows):
        for i, c in enumerate(coefficients):
            rest = curve.degree - i - curve.weight * k
            total += c * pow(x, i, modulus) * pow(y, k, modulus) * pow(z, rest, modulus)
    return total % modulus
