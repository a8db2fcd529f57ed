"""Linear Chabauty on quartics in x^2, y^2, z^2, whose Jacobian is isogenous to a product of elliptic curves.

The ranks of the three quotients w^2 = A y^4 + B y^2 z^2 + C z^4 come from 2-descent (PARI, ellrank: lower and
upper bound agree); their sum is the rank of J(Q).
"""

from __future__ import annotations

from fractions import Fraction
from itertools import product

import pytest

from sieve.curves.divisors import Divisor, Point, RationalPlace
from sieve.curves.plane import PlaneCurve
from sieve.errors import Inconsistent, PrecisionLost
from sieve.local.annihilators import characters
from sieve.local.linear_chabauty import ChabautyZeros, chabauty_zeros
from tests.support.pari import pari

# coefficients of x^4, y^4, z^4, x^2 y^2, y^2 z^2, x^2 z^2: rank
QUARTICS: dict[tuple[int, ...], int] = {
    (1, 1, -1, 0, 0, 0): 0,
    (1, -1, 2, 0, -1, -2): 1,
    (1, -1, 2, 0, -1, 1): 1,
    (1, -1, -2, 0, -2, 1): 1,
    (1, 1, -1, -1, 0, 0): 2,
    (1, -2, -2, 1, 1, 1): 2,
}


def quartic(key: tuple[int, ...]) -> PlaneCurve:
    exponents = [(4, 0, 0), (0, 4, 0), (0, 0, 4), (2, 2, 0), (0, 2, 2), (2, 0, 2)]
    return PlaneCurve(dict(zip(exponents, key, strict=True)))


def quotients(key: tuple[int, ...]) -> list[tuple[int, int]]:
    """(B, A C) for the quotients by the changes of one sign: Y^2 = X (X^2 + B X + A C)."""
    a, b, c, d, e, f = key
    out = []
    for x, y, z, xy, yz, xz in ((a, b, c, d, e, f), (b, c, a, e, f, d), (c, a, b, f, d, e)):
        first, middle, last = xy * xy - 4 * x * y, 2 * xy * xz - 4 * x * yz, xz * xz - 4 * x * z
        out.append((middle, first * last))
    return out


def points(curve: PlaneCurve) -> list[Point]:
    found = set()
    for x, y, z in product(range(-6, 7), repeat=3):
        if (x, y, z) != (0, 0, 0) and curve.contains((x, y, z)):
            found.add(curve.normalise(Fraction(x), Fraction(y), Fraction(z)))
    return sorted(found)


def near(zeros: ChabautyZeros, point: Point) -> list[int]:
    """The multiplicities of the balls that contain a rational point."""
    disc = zeros.integrals.disc_of(point)
    t, _ = zeros.integrals.parameter_of_point(point, 20)
    p = zeros.prime
    return [
        c.multiplicity for c in zeros.candidates()
        if c.disc == disc and (c.parameter - t) % p**c.digits == 0
    ]


@pytest.mark.parametrize("key", sorted(QUARTICS))
def test_ranks(key: tuple[int, ...]) -> None:
    total = 0
    for b, c in quotients(key):
        low, high = pari(f"ellrank(ellinit([0, {b}, 0, {c}, 0]))[1..2]")
        assert low == high
        total += int(low)
    assert total == QUARTICS[key]


GOOD = [(key, p) for key in sorted(QUARTICS) for p in (3, 5, 7, 13) if quartic(key).is_smooth(p)]


@pytest.mark.parametrize(("key", "p"), GOOD)
def test_known_points_are_among_the_zeros(key: tuple[int, ...], p: int) -> None:
    curve, rank = quartic(key), QUARTICS[key]
    known = points(curve)
    zeros = solved(curve, known, rank, p)
    assert len(zeros.annihilators) == 3 - rank
    assert all(len(near(zeros, point)) == 1 for point in known)
    # every generator shows a factor of positive rank of its own, so the other factors have rank 0
    assert all(a.exact for a in zeros.annihilators)
    assert zeros.count <= sum(d.count for d in zeros.discs)


def solved(curve: PlaneCurve, known: list[Point], rank: int, p: int) -> ChabautyZeros:
    """With the first differences of points that have independent logarithms as generators."""
    base = Divisor.of([(1, RationalPlace(known[0]))])
    for choice in product(known[1:], repeat=rank):
        if len(set(choice)) < rank:
            continue
        try:
            return chabauty_zeros(curve, base, [curve.difference(q, base) for q in choice], p, 6)
        except PrecisionLost:
            continue
    raise AssertionError("no independent generators")


def test_more_factors_than_generators_contradict_the_rank() -> None:
    key = (1, 1, -1, -1, 0, 0)
    curve = quartic(key)
    known = points(curve)
    base = Divisor.of([(1, RationalPlace(known[0]))])
    assert QUARTICS[key] == 2
    errors = 0
    for point in known[1:]:
        try:
            chabauty_zeros(curve, base, [curve.difference(point, base)], 7, 6)
        except Inconsistent as error:
            assert "rank is at least 2" in str(error)
            errors += 1
        except PrecisionLost:
            continue
    assert errors


def test_characters() -> None:
    assert len(set(characters(quartic((1, 1, -1, 0, 0, 0))))) == 3
    klein = PlaneCurve({(3, 1, 0): 1, (0, 3, 1): 1, (1, 0, 3): 1})
    assert set(characters(klein)) == {()}
