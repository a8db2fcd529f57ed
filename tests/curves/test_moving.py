"""Divisors moved within their class: the class stays, the denominators go."""

from __future__ import annotations

from fractions import Fraction

import pytest

from sieve.curves.divisors import MumfordPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.moving import residual_places
from sieve.local.picard import picard_group

X0_67 = HyperellipticCurve([1, -4, 2, -2, 1, 2, 1])


def through(points: list[tuple[int, int]]) -> MumfordPlace:
    """The sum of affine points with distinct x."""
    u, w = [Fraction(1)], [Fraction(0)] * len(points)
    for x, _ in points:
        u = [a - x * b for a, b in zip([Fraction(0), *u], [*u, Fraction(0)], strict=True)]
    for x, y in points:
        basis, scale = [Fraction(1)], Fraction(1)
        for other, _ in points:
            if other != x:
                shifted = zip([Fraction(0), *basis], [*basis, Fraction(0)], strict=True)
                basis, scale = [a - other * b for a, b in shifted], scale * (x - other)
        w = [a + y * b / scale for a, b in zip(w, basis, strict=True)]
    return X0_67.mumford(u, w)


@pytest.mark.parametrize(
    ("points", "p"),
    [([(-2, 7), (1, -1)], 3), ([(-2, 7), (1, -1), (0, 1)], 3), ([(0, 1), (1, 1)], 7), ([(-1, 3)], 5)],
)
def test_the_class_is_kept_and_the_reduction_defined(points: list[tuple[int, int]], p: int) -> None:
    """Compared in J(F_v) at other primes, where both divisors reduce."""
    place = through(points)
    found = list(residual_places(X0_67, place, p, 30))
    assert found
    for multiple, moved in found:
        assert place.degree + moved.degree == 2 * multiple
        assert all(c.denominator % p for c in moved.u + moved.w)
        compared = 0
        for v in (29, 31, 37, 41, 43):
            if any(c.denominator % v == 0 for c in moved.u + moved.w + place.u + place.w):
                continue
            group = picard_group(X0_67.modulo(v))
            first, second = (group.log(group.curve.reduce(d)) for d in (place, moved))
            for a, b, u, d in zip(first, second, group.unit_log, group.invariants, strict=True):
                assert (a + b - multiple * u) % d == 0
            compared += 1
        assert compared


def test_the_same_places_every_time() -> None:
    place = through([(-2, 7), (1, -1)])
    assert list(residual_places(X0_67, place, 3, 12)) == list(residual_places(X0_67, place, 3, 12))
