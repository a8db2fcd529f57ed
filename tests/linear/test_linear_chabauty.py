"""Linear Chabauty on curves whose rational points are published, and against an independent description.

Where the Jacobian is isogenous to E1 x E2 and one factor has rank 0, the zeros of the annihilating integral
are the p-adic points whose image on that factor is a torsion point: they are counted with PARI's division
polynomials.
"""

from __future__ import annotations

from functools import cache

import pytest
from cypari import pari

from sieve.curves.divisors import Divisor, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.engine.proposal import Proposal, propose
from sieve.errors import Inconsistent, PrecisionLost
from sieve.local.linear_chabauty import ChabautyZeros, chabauty_zeros
from tests.support.reference_cases import ReferenceCase, reference_case

# The rank of each is in the reference file, with its source.
RANK_ONE = ["quadratic_period_5", "five_roots_0_1_2_5_6", "X0_37", "lmfdb2059"]
RANK_ZERO = ["X1_13", "X1_16"]
PRIMES = [3, 5, 7, 11, 13]
PAIRS = [
    (name, p) for name in RANK_ONE + RANK_ZERO for p in PRIMES if p not in reference_case(name).bad_primes
]

# y^2 = l x^6 + a x^4 + b x^2 + c with the ranks of E1 and E2, from a small search; `test_ranks` proves them.
BIELLIPTIC = {
    (1, 13, -8, -240): (0, 1),
    (1, 4, -15, -18): (0, 1),
    (1, -16, 76, -96): (1, 0),
    (1, -16, 79, -120): (1, 0),
    (1, -1, -4, 4): (0, 1),
    (1, 0, 6, -7): (0, 1),
    (1, 1, 4, 4): (0, 1),
    (1, 0, -4, 4): (1, 0),
    (1, 2, -79, 220): (0, 1),
    (1, 19, 100, 132): (0, 1),
}


def even_curve(key: tuple[int, int, int, int]) -> HyperellipticCurve:
    lead, a, b, c = key
    return HyperellipticCurve([c, 0, b, 0, a, 0, lead])


def factors(key: tuple[int, int, int, int]) -> tuple[list[int], list[int]]:
    """(a2, a4, a6) of E1 and E2, by (l x^2, l y) and (c / x^2, c y / x^3)."""
    lead, a, b, c = key
    return [a, lead * b, lead * lead * c], [b, a * c, lead * c * c]


@cache
def proposal(curve: HyperellipticCurve, rank: int) -> Proposal:
    return propose(curve, rank, largest=1)


@cache
def reference_zeros(name: str, p: int, digits: int) -> ChabautyZeros:
    case = reference_case(name)
    curve = HyperellipticCurve(case.f, case.h)
    base = Divisor.of([(1, RationalPlace(curve.normalise(*case.relation_points[0])))])
    generators = []
    if case.rank:
        free = [row[0] for row in case.relation_coordinates]
        smallest = min((abs(c), i) for i, c in enumerate(free) if c)[1]
        point = RationalPlace(curve.normalise(*case.relation_points[smallest]))
        generators = [Divisor.of([(1, point)]) - base]
    return chabauty_zeros(curve, base, generators, p, digits)


def known(case: ReferenceCase) -> list[tuple[int, int, int]]:
    curve = HyperellipticCurve(case.f, case.h)
    return [curve.normalise(*p) for p in case.known_points]


def near(zeros: ChabautyZeros, point: tuple[int, int, int]) -> list[int]:
    """The multiplicities of the balls that hold a rational point."""
    disc = zeros.integrals.disc_of(point)
    found = next(d for d in zeros.discs if d.disc == disc)
    out = []
    for ball in found.balls:
        t, _ = zeros.integrals.parameter_of_point(point, ball.digits)
        if (t - ball.value) % zeros.prime**ball.digits == 0:
            out.append(ball.multiplicity)
    return out


@pytest.mark.parametrize(("name", "p"), PAIRS)
def test_every_known_point_is_a_zero(name: str, p: int) -> None:
    zeros = reference_zeros(name, p, 10)
    assert all(ball.digits == 10 for d in zeros.discs for ball in d.balls)
    assert all(len(near(zeros, point)) == 1 for point in known(reference_case(name)))


@pytest.mark.parametrize(("name", "p"), PAIRS)
def test_twice_the_digits_give_the_same_zeros(name: str, p: int) -> None:
    few, many = reference_zeros(name, p, 10), reference_zeros(name, p, 20)
    for a, b in zip(few.discs, many.discs, strict=True):
        assert a.count == b.count
        assert [(x.value, x.multiplicity) for x in a.balls] == [
            (x.value % p**10, x.multiplicity) for x in sorted(b.balls, key=lambda x: x.value % p**10)
        ]


@pytest.mark.parametrize(("name", "p"), PAIRS)
def test_published_bounds(name: str, p: int) -> None:
    """#X(F_p) + 2 g - 2 for p > 2 g (Coleman 1985); #X(F_p) + 2 r for p > 2 r + 2, r < g (Stoll 2006).

    Both bound the zeros in the discs, of one annihilating integral and of the best one in each disc.
    """
    case, zeros = reference_case(name), reference_zeros(name, p, 10)
    number, rank = len(zeros.discs), int(case.rank or 0)
    total = sum(d.count for d in zeros.discs)
    if p > 4:
        assert total <= number + 2
    if p > 2 * rank + 2:
        assert total <= number + 2 * rank
    assert all(sum(b.multiplicity for b in d.balls) <= d.count for d in zeros.discs)
    assert zeros.count >= len(case.known_points)


def test_one_digit_means_whole_discs() -> None:
    """At p = 3 two discs of the first curve hold two zeros each, all four of them known points."""
    zeros = reference_zeros("quadratic_period_5", 3, 1)
    balls = [ball for d in zeros.discs for ball in d.balls]
    assert sorted((b.value, b.digits, b.multiplicity) for b in balls) == [(0, 1, 1)] * 2 + [(0, 1, 2)] * 2
    assert zeros.count == len(zeros.discs) == 4


def test_the_bound_of_coleman_is_sharp_once() -> None:
    """Gordon and Grant 1993, in McCallum and Poonen's survey: #X(F_7) + 2 = 10 points (from memory)."""
    zeros = reference_zeros("five_roots_0_1_2_5_6", 7, 10)
    assert zeros.count == sum(d.count for d in zeros.discs) == len(zeros.discs) + 2 == 10


@pytest.mark.parametrize("key", sorted(BIELLIPTIC))
def test_ranks(key: tuple[int, int, int, int]) -> None:
    for (a2, a4, a6), rank in zip(factors(key), BIELLIPTIC[key], strict=True):
        lower, upper = pari.ellrank(pari.ellinit([0, a2, 0, a4, a6]))[:2]
        assert int(lower) == int(upper) == rank


def torsion_zeros(key: tuple[int, int, int, int], p: int) -> int:
    """The number of points of X(Q_p) that map to torsion points of the factor of rank 0 (leading term 1)."""
    lead, _, _, c = key
    assert lead == 1
    first = BIELLIPTIC[key][0] == 0
    a2, a4, a6 = factors(key)[0 if first else 1]
    curve = f"ellinit([0, {a2}, 0, {a4}, {a6}])"
    # torsion over Q_p injects into the reduction: p is odd
    order = int(pari(f"{p} + 1 - ellap({curve}, {p})"))
    # the zero of the group comes from the points at infinity, or from those with x = 0
    total = 2 if first else 2 * int(pari(f"issquare({c} + O({p}^20))"))
    for root in pari(f"polrootspadic(elldivpol({curve}, {order}), {p}, 40)"):
        u = pari.lift(root)
        value = f"(({u})^3 + ({a2})*({u})^2 + ({a4})*({u}) + ({a6}) + O({p}^20))"
        ys = 1 if int(pari(f"{value} == 0")) else 2 * int(pari(f"issquare({value})"))
        if int(pari(f"({u}) + O({p}^20) == 0")):
            total += ys  # x = 0, or infinity
        else:
            square = f"({u}) + O({p}^20)" if first else f"{c}/(({u}) + O({p}^20))"
            total += ys * 2 * int(pari(f"issquare({square})"))
    return total


@pytest.mark.parametrize("p", [3, 5, 7, 11, 13, 17])
@pytest.mark.parametrize("key", sorted(BIELLIPTIC))
def test_zeros_are_the_points_over_torsion(key: tuple[int, int, int, int], p: int) -> None:
    curve = even_curve(key)
    if not curve.is_smooth(p):
        pytest.skip("bad reduction")
    found = proposal(curve, 1)
    zeros = chabauty_zeros(curve, found.base, found.generators, p, 8)
    assert zeros.annihilators[0].exact
    assert zeros.count == torsion_zeros(key, p)
    for point in found.points:
        (multiplicity,) = near(zeros, point)
        # the differential x dx/y of the first factor vanishes where x = 0, dx/y of the second at infinity
        special = point[0] == 0 if BIELLIPTIC[key][0] == 0 else point[2] == 0
        assert multiplicity == (2 if special else 1)
    doubled = [d for d in zeros.discs for b in d.balls if b.multiplicity == 2]
    assert len(zeros.alone) == len([p for p in found.points if near(zeros, p) == [2]]) <= len(doubled)


def test_a_generator_with_parts_in_both_factors_contradicts_rank_one() -> None:
    """On the demo curve of rank 2 a known point has components in both factors."""
    curve = HyperellipticCurve([9, 0, -2, 0, 1, 0, 1])
    base = Divisor.of([(1, RationalPlace((1, 1, 0)))])
    generator = Divisor.of([(1, RationalPlace((0, 3, 1)))]) - base
    with pytest.raises(Inconsistent, match="rank is at least 2"):
        chabauty_zeros(curve, base, [generator], 7, 6)


def test_a_torsion_class_as_generator_never_gets_enough_digits() -> None:
    """Its logarithm is 0, so no number of digits shows that it has infinite order."""
    case = reference_case("X1_13")
    curve = HyperellipticCurve(case.f, case.h)
    base = Divisor.of([(1, RationalPlace((1, 1, 0)))])
    with pytest.raises(PrecisionLost, match="generator"):
        chabauty_zeros(curve, base, [Divisor.of([(1, RationalPlace((0, 1, 1)))]) - base], 5, 4)


# ---- genus 3: several differentials ---------------------------------------------------------------------

# The rank of the group that points of small height generate (found here; the rank of J is not proved).
GENUS_THREE = {
    (0, -3, 3, 3, -2, -1, -2, 1, 1): 1,
    (1, -1, 3, 0, -3, 1, 2, 1): 2,
    (1, 0, 2, 3, 2, -3, -3, 1): 2,
}


@pytest.mark.parametrize("p", [5, 7])
@pytest.mark.parametrize("f", sorted(GENUS_THREE))
def test_genus_three(f: tuple[int, ...], p: int) -> None:
    """g - r differentials; every point whose class is in the span of the generators is a common zero."""
    curve = HyperellipticCurve(f)
    if not curve.is_smooth(p):
        pytest.skip("bad reduction")
    found = proposal(curve, GENUS_THREE[f])
    assert len(found.generators) == GENUS_THREE[f]
    few = chabauty_zeros(curve, found.base, found.generators, p, 6)
    many = chabauty_zeros(curve, found.base, found.generators, p, 12)
    assert len(few.annihilators) == 3 - GENUS_THREE[f]
    assert [[(b.value, b.multiplicity) for b in d.balls] for d in few.discs] == [
        sorted((b.value % p**6, b.multiplicity) for b in d.balls) for d in many.discs
    ]
    for point in found.points:
        assert len(near(many, point)) == 1
    if p > 6:
        # Coleman 1985, for each differential alone
        assert sum(d.count for d in few.discs) <= len(few.discs) + 4


def test_more_generators_leave_more_zeros() -> None:
    """The zeros for a larger group contain those for a smaller one: the span of one generator of two."""
    curve = HyperellipticCurve((1, -1, 3, 0, -3, 1, 2, 1))
    found = proposal(curve, 2)
    one = chabauty_zeros(curve, found.base, found.generators[:1], 7, 8)
    two = chabauty_zeros(curve, found.base, found.generators, 7, 8)
    assert (len(one.annihilators), len(two.annihilators)) == (2, 1)
    for small, large in zip(one.discs, two.discs, strict=True):
        values = {b.value for b in large.balls}
        assert all(b.value in values for b in small.balls)
    assert one.count < two.count
