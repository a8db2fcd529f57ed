"""Moving a divisor over Q within its class so that it reduces well at a prime.

A Mumford representation (u, w) has denominators at p when a point reduces to infinity, or when two points
reduce to conjugate ones.  A section even(x) + odd(x) y of multiple m that vanishes on the divisor D leaves a
residual divisor R with D + R ~ m U; for all but few sections R is given by polynomials that are integral at
p.
"""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from math import lcm

import flint
import numpy as np

from sieve.curves.divisors import MumfordPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.exact.lattice import hermite


def residual_places(
    curve: HyperellipticCurve, place: MumfordPlace, prime: int, tries: int
) -> Iterator[tuple[int, MumfordPlace]]:
    """Pairs (m, R) with place + R ~ m U and R integral at the prime, from at most `tries` sections.

    Deterministic (seeded by the prime).  Sections are short vectors of the lattice of integral sections that
    vanish on the divisor; that lattice is saturated, so its reduction modulo the prime loses none of them.

    >>> curve = HyperellipticCurve([1, -4, 2, -2, 1, 2, 1])
    >>> place = curve.mumford([-2, 1, 1], [Fraction(5, 3), Fraction(-8, 3)])  # (-2, 7) and (1, -1)
    >>> multiple, moved = next(residual_places(curve, place, 3, 20))
    >>> moved.degree == 2 * multiple - 2, any(c.denominator % 3 == 0 for c in moved.w)
    (True, False)
    """
    genus, degree = curve.genus, place.degree
    rng = np.random.default_rng([prime, degree, 3])
    u, w = _poly(place.u), _poly(place.w)
    f, h = flint.fmpq_poly(list(curve.f)), flint.fmpq_poly(list(curve.h))
    least = max(genus + 1, (degree + genus + 1) // 2)
    bases: dict[int, list[list[int]]] = {}
    for attempt in range(tries):
        multiple = least + attempt % 6
        if multiple not in bases:
            bases[multiple] = _vanishing(u, w, multiple, multiple - genus)
        basis = bases[multiple]
        factors = [int(c) for c in rng.integers(-2, 3, len(basis))]
        columns = zip(*basis, strict=True)
        vector = [sum(c * x for c, x in zip(factors, column, strict=True)) for column in columns]
        even, odd = flint.fmpq_poly(vector[: multiple + 1]), flint.fmpq_poly(vector[multiple + 1 :])
        norm = even * even - h * even * odd - f * odd * odd
        if norm.degree() != 2 * multiple or norm.degree() == degree:
            continue
        rest, _ = divmod(norm, u)
        rest = rest / rest.coeffs()[-1]
        common, inverse, _ = odd.xgcd(rest)
        if common.degree() != 0:
            continue
        value = (-even * inverse / common) % rest
        moved = MumfordPlace(_fractions(rest), _fractions(value))
        if all(c.denominator % prime for c in moved.u + moved.w):
            yield multiple, moved


def _vanishing(u: flint.fmpq_poly, w: flint.fmpq_poly, multiple: int, width: int) -> list[list[int]]:
    """A reduced basis of the integral sections (even, odd) of a multiple that vanish on (u, w)."""
    degree, size = u.degree(), multiple + 1 + width
    columns, power = [], flint.fmpq_poly([1])
    x = flint.fmpq_poly([0, 1])
    for _ in range(multiple + 1):
        columns.append(power)
        power = power * x % u
    power = w % u
    for _ in range(width):
        columns.append(power)
        power = power * x % u
    scale = lcm(*(int(c.denom()) for c in columns))
    rows = []
    for k, column in enumerate(columns):
        values = [int((column[i] * scale).p) for i in range(degree)]
        rows.append(values + [int(i == k) for i in range(size)])
    kernel = [list(row[degree:]) for row in hermite(rows) if not any(row[:degree])]
    reduced = flint.fmpz_mat(kernel).lll()
    return [[int(reduced[i, j]) for j in range(size)] for i in range(len(kernel))]


def _poly(values: tuple[Fraction, ...]) -> flint.fmpq_poly:
    return flint.fmpq_poly([flint.fmpq(c.numerator, c.denominator) for c in values])


def _fractions(poly: flint.fmpq_poly) -> tuple[Fraction, ...]:
    return tuple(Fraction(int(c.p), int(c.q)) for c in poly.coeffs())
