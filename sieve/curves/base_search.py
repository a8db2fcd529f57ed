"""Closed points of small degree on y^2 + h(x) y = f(x), for curves without known rational points.

Where y = c(x)/d meets the curve, d^2 f - c^2 - d h c = 0: every irreducible factor q of this polynomial gives
the closed point q(x) = 0, y = c(x)/d.  A closed point of odd degree 2 k + 1 minus k fibres of the map to the
x-line is a divisor of degree 1, one of degree 2 k minus k fibres is a divisor of degree 0.
"""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from itertools import product

import flint

from sieve.curves.divisors import Divisor, FibrePlace, MumfordPlace
from sieve.curves.protocol import Curve


def closed_points(
    curve: Curve, size: int, denominators: int = 2, degree: int | None = None
) -> list[MumfordPlace]:
    """Closed points of degree at most `degree` (default: g + 1), one of each pair of conjugates.

    Arguments: `size` >= 0, a bound for the coefficients of c, of degree at most g + 1; 1 <= d <=
    `denominators`. Every point found is exact; the search is bounded, so that an empty list proves nothing.
    Sorted by degree, then by the size of the coefficients.  Cost: `denominators` * (2 size + 1)^(g + 2)
    factorisations.

    >>> from sieve.curves.hyperelliptic import HyperellipticCurve
    >>> curve = HyperellipticCurve([2, 0, 1, 0, -5, 0, -5])
    >>> [place.degree for place in closed_points(curve, 2)]
    [2, 2]
    """
    limit = curve.genus + 1 if degree is None else degree
    found: set[MumfordPlace] = set()
    f, h = flint.fmpz_poly([-c for c in curve.rows[0]]), flint.fmpz_poly(list(curve.rows[1]))
    for d in range(1, denominators + 1):
        for coefficients in _polynomials(curve.genus + 2, size):
            c = flint.fmpz_poly(coefficients)
            norm = d * d * f - c * c - d * h * c
            if norm.degree() < 1:
                continue
            for factor, _ in norm.factor()[1]:
                if factor.degree() <= limit:
                    place = _place(factor, c, d)
                    if _conjugate(curve, place) not in found:
                        found.add(place)
    return sorted(found, key=lambda place: (place.degree, _height(place), place))


def _polynomials(length: int, size: int) -> Iterator[list[int]]:
    """All coefficient lists with entries up to `size`, small ones first."""
    values = sorted(range(-size, size + 1), key=lambda a: (abs(a), -a))
    for entries in product(values, repeat=length):
        yield list(entries[::-1])


def _place(factor: flint.fmpz_poly, c: flint.fmpz_poly, d: int) -> MumfordPlace:
    lead = factor.coeffs()[-1]
    u = flint.fmpq_poly(factor) / lead
    w = flint.fmpq_poly(c) / d % u
    return MumfordPlace(_fractions(u), _fractions(w))


def _conjugate(curve: Curve, place: MumfordPlace) -> MumfordPlace:
    u = flint.fmpq_poly([flint.fmpq(a.numerator, a.denominator) for a in place.u])
    w = flint.fmpq_poly([flint.fmpq(a.numerator, a.denominator) for a in place.w])
    return MumfordPlace(place.u, _fractions((-w - flint.fmpq_poly(list(curve.rows[1]))) % u))


def _fractions(poly: flint.fmpq_poly) -> tuple[Fraction, ...]:
    return tuple(Fraction(int(c.p), int(c.q)) for c in poly.coeffs())


def _height(place: MumfordPlace) -> int:
    return max(max(abs(c.numerator), c.denominator) for c in place.u + place.w)


def base_from(place: MumfordPlace) -> Divisor:
    """The divisor of degree 1 of a closed point of odd degree."""
    fibres = place.degree // 2
    return Divisor.of([(1, place), (-1, FibrePlace(fibres))] if fibres else [(1, place)])


def difference_from(place: MumfordPlace, base: Divisor) -> Divisor:
    """The divisor of degree 0 of a closed point: minus fibres, and minus the base when its degree is odd."""
    fibres = place.degree // 2
    divisor = Divisor.of([(1, place), (-1, FibrePlace(fibres))] if fibres else [(1, place)])
    return divisor - base if place.degree % 2 else divisor
