"""Picard groups: laws that hold in any correct group, certificates, refusals, bounds for orders."""

from __future__ import annotations

import itertools
import random

import numpy as np
import pytest
from flint import fmpz_mat, fmpz_poly

from sieve.curves.divisors import Divisor, FibrePlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.hyperelliptic_mod import LocalDivisor
from sieve.errors import BadReduction, InternalError, Uncertified
from sieve.local.exact_sections import close_lattice
from sieve.local.order_bounds import exact_order, order_lower_bound
from sieve.local.picard import PicardGroup, order_upper_exceeds, picard_group
from sieve.local.records import divisor_log, local_record
from tests.support.planted import planted_curve
from tests.support.point_counts import count_points, jacobian_order_by_counting
from tests.support.reference_cases import primes, reference_case

SMALL = list(primes(48))


def random_curves(count: int) -> list[HyperellipticCurve]:
    return [planted_curve(random.Random(f"picard {i}"), 2 + i % 2)[0] for i in range(count)]


def groups(curve: HyperellipticCurve, bound: int = 48) -> list[PicardGroup]:
    found = []
    for v in primes(bound):
        if curve.is_smooth(v):
            try:
                found.append(picard_group(curve.modulo(v)))
            except Uncertified:
                assert v < 11
    return found


def index(rows: list[list[int]], moduli: tuple[int, ...]) -> int:
    """The index of the subgroup that the rows generate in the product of Z/m."""
    width = len(moduli)
    periods = [[m if i == j else 0 for j in range(width)] for i, m in enumerate(moduli)]
    form = fmpz_mat([*rows, *periods]).hnf()
    value = 1
    for i in range(width):
        value *= int(form[i, i])
    return value


@pytest.mark.parametrize("number", range(8))
def test_every_section_is_principal(number: int) -> None:
    """Zeros of random sections, of all degrees and multiplicities, add up to a multiple of U."""
    curve = random_curves(number + 1)[number]
    rng = np.random.default_rng(number)
    seen_higher = seen_multiple = 0
    for group in groups(curve):
        reduced = group.curve
        for k in range(12):
            c = reduced.random_section(rng, k % 3)
            divisor = reduced.section_divisor(c)
            try:
                total = group.log(LocalDivisor(0, divisor.points, divisor.places))
            except Uncertified:
                continue
            assert total == group.log(LocalDivisor(divisor.units, ()))
            seen_higher += bool(divisor.places)
            seen_multiple += any(m > 1 for _, m in divisor.points)
    assert seen_higher and seen_multiple


@pytest.mark.parametrize("number", range(6))
def test_laws_of_the_points(number: int) -> None:
    curve = random_curves(number + 1)[number]
    for group in groups(curve):
        reduced, moduli = group.curve, group.invariants
        rows = [[int(a) for a in row] for row in group.point_logs]
        # P - P0 determines P, and P0 is a point
        assert [0] * len(moduli) in rows
        assert len({tuple(row) for row in rows}) == reduced.count
        for i, j in enumerate(reduced.partner.tolist()):
            total = [(a + b) % m for a, b, m in zip(rows[i], rows[j], moduli, strict=True)]
            assert tuple(total) == group.unit_log
        product = 1
        for small, large in itertools.pairwise(moduli):
            assert large % small == 0
        for m in moduli:
            product *= m
        assert product == group.order and all(m > 1 for m in moduli)
        if group.reason.startswith("rational points generate"):
            assert index([*rows, list(group.unit_log)], moduli) == 1
        assert (group.point_logs == picard_group(curve.modulo(reduced.prime)).point_logs).all()


@pytest.mark.parametrize("v", [v for v in primes(32) if v > 2])
def test_orders_by_counting(v: int) -> None:
    for curve in random_curves(6):
        if curve.is_smooth(v) and v**curve.genus < 3000:
            try:
                group = picard_group(curve.modulo(v))
            except Uncertified:
                continue
            assert group.order == jacobian_order_by_counting(v, curve.f, curve.h, curve.genus)


def test_both_ways_agree() -> None:
    """The vectorised way and the exact one give isomorphic groups with the same relations between points."""
    for curve in random_curves(4):
        for v in (31, 37, 43):
            if not curve.is_smooth(v):
                continue
            reduced = curve.modulo(v)
            group = picard_group(reduced)
            closed = close_lattice(reduced, [], group.order, True, 60_000)
            assert closed is not None and closed.invariants == group.invariants
            orders = []
            for moduli, logs in (
                (group.invariants, [[int(a) for a in group.point_logs[i]] for i in range(reduced.count)]),
                (
                    closed.invariants,
                    [
                        [
                            int(reduced.sign[i]) * a + int(reduced.fibre[i]) * u
                            for a, u in zip(closed.logs[int(reduced.orbit[i])], closed.unit, strict=True)
                        ]
                        for i in range(reduced.count)
                    ],
                ),
            ):
                # orders of P - 2 Q + R, which do not depend on the point P0
                triples = [zip(logs[i], logs[i - 1], logs[i - 2], strict=True) for i in range(20)]
                rows = [[a - 2 * b + c for a, b, c in triple] for triple in triples]
                orders.append([group.order // index([row], moduli) for row in rows])
            assert orders[0] == orders[1]


def test_wrong_bounds_are_noticed() -> None:
    reduced = reference_case_curve("X0p67").modulo(13)
    with pytest.raises(InternalError, match="below the bound"):
        close_lattice(reduced, [], 10**6, False, 60_000)
    assert close_lattice(reduced, [], 295, True, 3) is None
    # an order that is not the index: never certified
    assert close_lattice(reduced, [], 294, True, 600) is None


def reference_case_curve(name: str) -> HyperellipticCurve:
    case = reference_case(name)
    return HyperellipticCurve(case.f, case.h)


def test_refusals() -> None:
    with pytest.raises(BadReduction):
        reference_case_curve("X0p67").modulo(67)
    rng = random.Random(1)
    lonely = []
    while len(lonely) < 3:
        f = [rng.randint(-9, 9) for _ in range(6)] + [rng.randint(1, 9)]
        if fmpz_poly(f).discriminant() == 0:
            continue
        curve = HyperellipticCurve(f)
        for v in (3, 5):
            if curve.is_smooth(v) and count_points(v, 1, curve.f, curve.h, 2) == 0:
                lonely.append((curve, v))
    for curve, v in lonely:
        with pytest.raises(Uncertified, match="no points"):
            picard_group(curve.modulo(v))
        # no point modulo v: a condition that nothing satisfies
        record = local_record(curve, Divisor.of([(1, FibrePlace(1))]), [], v)
        assert record.usable and record.points == 0 and record.condition().count == 0


def test_bounds_for_orders() -> None:
    for curve in random_curves(6):
        g = curve.genus
        for v in primes(14):
            if not curve.is_smooth(v) or v**g > 1500:
                continue
            reduced = curve.modulo(v)
            counts = [count_points(v, e, curve.f, curve.h, g) for e in range(1, g + 1)]
            assert counts == [reduced.extension_count(e) for e in range(1, g + 1)]
            order = jacobian_order_by_counting(v, curve.f, curve.h, g)
            assert exact_order(reduced, counts) == order
            lower = order_lower_bound(v, g, reduced.count)
            assert 1 <= lower <= order
            # whatever the bound says cannot be reached is above the order
            assert order_upper_exceeds(v, g, reduced.count, order)


def test_divisors_over_the_rationals() -> None:
    """A pair (u, w) that splits over Q is the sum of its points, at every good v; fibres are equivalent."""
    curve = HyperellipticCurve([1, -2, 1, 2, 2, 4, 1])
    pair = Divisor.of([(1, curve.mumford([0, -1, 1], [1, 2]))])
    points = Divisor.of([(1, curve.place_of_point((0, 1, 1))), (1, curve.place_of_point((1, 3, 1)))])
    fibre = Divisor.of([(1, FibrePlace(1))])
    whole = Divisor.of([(1, curve.place_of_point((1, 3, 1))), (1, curve.place_of_point((1, -3, 1)))])
    infinite = Divisor.of([(1, curve.place_of_point((1, 1, 0))), (1, curve.place_of_point((1, -1, 0)))])
    for v in primes(60):
        if curve.is_smooth(v):
            group = picard_group(curve.modulo(v))
            assert divisor_log(group, pair) == divisor_log(group, points)
            assert divisor_log(group, fibre) == divisor_log(group, whole) == divisor_log(group, infinite)
