"""Other equations for a divisor over Q, or for one in its class, that reduce well at a prime.

The points of a closed place (u, x, y, z) are also functions of the values of a quotient of two linear forms;
for most quotients these are integral at p, if the points are told apart modulo p at all.

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

from sieve.curves.algebras import characteristic_polynomial, express, fractions_of, rational_poly
from sieve.curves.divisors import ClosedPlace, MumfordPlace
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


def rewritten_places(place: ClosedPlace, prime: int, tries: int) -> Iterator[ClosedPlace]:
    """The same place with all coefficients integral at the prime, from at most `tries` quotients of forms.

    Deterministic (seeded by the prime).

    >>> place = ClosedPlace((Fraction(-2, 9), Fraction(0), Fraction(1)), (Fraction(1),),
    ...     (Fraction(0), Fraction(3)), (Fraction(1),))  # (1 : s : 1), s^2 = 2
    >>> all(c.denominator % 3 for c in next(rewritten_places(place, 3, 20)).u)
    True
    """
    rng = np.random.default_rng([prime, place.degree, 5])
    u, *coordinates = (rational_poly(c) for c in (place.u, place.x, place.y, place.z))
    for _ in range(tries):
        top, bottom = rational_poly([]), rational_poly([])
        for c, d, f in zip(*rng.integers(-2, 3, (2, 3)).tolist(), coordinates, strict=True):
            top, bottom = top + c * f, bottom + d * f
        common, inverse, _ = bottom.xgcd(u)
        if common.degree() != 0:
            continue
        inverse = inverse / common
        value = top * inverse % u
        modulus = characteristic_polynomial(value, u)
        if modulus.gcd(modulus.derivative()).degree() > 0:
            continue
        parts = [fractions_of(express(f * inverse % u, value, u)) for f in coordinates]
        found = ClosedPlace(fractions_of(modulus), *parts)
        if all(c.denominator % prime for part in (found.u, *parts) for c in part):
            yield found


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
