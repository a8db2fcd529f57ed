"""Finite algebras K[t]/m over the rationals: characteristic polynomials and generators."""

from __future__ import annotations

from collections.abc import Sequence
from fractions import Fraction

import flint


def rational_poly(coefficients: Sequence[Fraction | int]) -> flint.fmpq_poly:
    """The polynomial with these coefficients, low degree first."""
    values = [Fraction(c) for c in coefficients]
    return flint.fmpq_poly([flint.fmpq(c.numerator, c.denominator) for c in values])


def fractions_of(poly: flint.fmpq_poly) -> tuple[Fraction, ...]:
    """The coefficients, low degree first, without leading zeros."""
    return tuple(Fraction(int(c.p), int(c.q)) for c in poly.coeffs())


def characteristic_polynomial(a: flint.fmpq_poly, m: flint.fmpq_poly) -> flint.fmpq_poly:
    """The characteristic polynomial of multiplication by a on Q[t]/m."""
    n = m.degree()
    rows = []
    power = a % m
    for _ in range(n):
        coefficients = list(power.coeffs())
        rows.append(coefficients + [flint.fmpq(0)] * (n - len(coefficients)))
        power = (power * flint.fmpq_poly([0, 1])) % m
    matrix = flint.fmpq_mat(n, n, [c for row in rows for c in row])
    return flint.fmpq_poly(list(matrix.charpoly().coeffs()))


def express(b: flint.fmpq_poly, a: flint.fmpq_poly, m: flint.fmpq_poly) -> flint.fmpq_poly:
    """The polynomial w with b = w(a) modulo m, where a generates the algebra Q[t]/m."""
    n = m.degree()
    columns, power = [], flint.fmpq_poly([1])
    for _ in range(n):
        coefficients = list(power.coeffs())
        columns.append(coefficients + [flint.fmpq(0)] * (n - len(coefficients)))
        power = (power * a) % m
    matrix = flint.fmpq_mat(n, n, [columns[j][i] for i in range(n) for j in range(n)])
    target = list(b.coeffs())
    right = flint.fmpq_mat(n, 1, target + [flint.fmpq(0)] * (n - len(target)))
    solution = matrix.solve(right)
    return flint.fmpq_poly([solution[i, 0] for i in range(n)])


__all__ = ["characteristic_polynomial", "express", "fractions_of", "rational_poly"]
