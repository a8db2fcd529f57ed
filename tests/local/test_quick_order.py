"""The possible orders of J(F_v) against the certified groups."""

from __future__ import annotations

import pytest

from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.local.picard import picard_group
from sieve.local.quick_order import quick_order
from tests.support.reference_cases import reference_case


@pytest.mark.parametrize("name", ["X0p67", "integral_g2", "lmfdb13689", "X1_13", "binomial_y2_x5"])
def test_the_order_is_among_the_possible_ones(name):
    case = reference_case(name)
    curve = HyperellipticCurve(case.f, case.h)
    ambiguous = 0
    for v in case.good_primes(420, 80):
        found = quick_order(case.f, case.h, v)
        group = picard_group(curve.modulo(v))
        assert found is not None
        assert found.points == len(group.point_logs) and group.order in found.orders
        assert list(found.orders) == sorted(set(found.orders)) and 1 <= len(found.orders) <= 5
        ambiguous += len(found.orders)
    assert ambiguous < 4 * len(case.good_primes(420, 80))


def test_small_and_bad_primes_and_other_genera_have_none():
    case = reference_case("X0p67")
    assert quick_order(case.f, case.h, 79) is None
    assert quick_order([1, 0, 0, 0, 0, 1], [], 5) is None
    assert quick_order([101, 0, 0, 0, 0, 0, 101], [], 101) is None
    assert quick_order([1, 0, 101, 0, 0, 0, 1], [], 101) is not None
    genus3 = reference_case("integral_g3")
    assert quick_order(genus3.f, genus3.h, 101) is None


def test_the_example_of_the_documentation():
    """Weil: the possible orders differ by multiples of v, and one is the order found by counting."""
    case = reference_case("X0p67")
    found = quick_order(case.f, case.h, 101)
    assert found is not None
    assert all((a - found.orders[0]) % 101 == 0 for a in found.orders)
