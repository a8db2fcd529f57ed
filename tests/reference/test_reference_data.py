"""The stored reference data agree with PARI, with counting, and with textbook arithmetic in J(F_v)."""

from __future__ import annotations

import random

import pytest
from flint import fmpz_mat

from tests.support.reference_cases import ReferenceCase, reference_case, reference_cases

CASES = reference_cases()
IDS = [case.id for case in CASES]


def test_the_file_is_complete() -> None:
    assert len(CASES) == 30
    assert sum(bool(case.relation_points) for case in CASES) == 24


@pytest.mark.parametrize("case", CASES, ids=IDS)
def test_known_points_lie_on_the_model(case: ReferenceCase) -> None:
    assert len(case.known_points) == case.raw["points"]["total"]
    assert all(case.on_curve(point) for point in case.known_points)
    assert set(case.relation_points) <= set(case.known_points)


@pytest.mark.parametrize("case", CASES, ids=IDS)
def test_orders_and_counts_are_those_of_pari(case: ReferenceCase) -> None:
    for v, order in case.raw.get("jac_orders", {}).items():
        assert case.order(int(v)) == order
    for v, count in case.raw.get("counts", {}).items():
        assert len(case.oracle(int(v)).J.points) == count


@pytest.mark.parametrize("case", CASES, ids=IDS)
def test_structures_are_the_stored_ones(case: ReferenceCase) -> None:
    for record in case.raw.get("jac_structure", []):
        if "J_invariants" in record and record["p"] < 60:
            assert case.oracle(record["p"]).invariants() == record["J_invariants"]


@pytest.mark.parametrize("case", [c for c in CASES if c.relation_points], ids=lambda c: c.id)
def test_relations_between_known_points_hold_modulo_v(case: ReferenceCase) -> None:
    """Whatever combination of [P - base] has coordinates zero is zero in J(F_v) for every good v."""
    rows = case.relation_coordinates
    width = len(rows[0])
    rank = width - len(case.torsion)
    # Integer combinations of the rows (and of the torsion orders) that vanish: the kernel of a matrix.
    periods = [[t if j == rank + i else 0 for j in range(width)] for i, t in enumerate(case.torsion)]
    stacked = [list(row) for row in rows[1:]] + periods
    unit = [[int(i == k) for k in range(len(stacked))] for i in range(len(stacked))]
    hermite = fmpz_mat([row + one for row, one in zip(stacked, unit, strict=True)]).hnf()
    table = [[int(c) for c in row] for row in hermite.table()]
    kernel = [row[width : width + len(rows) - 1] for row in table if not any(row[:width])]
    assert len(kernel) >= len(rows) - 1 - rank
    for v in case.good_primes(40, 5):
        J = case.oracle(v).J
        base = J.of_point(case.relation_points[0])
        classes = [J.add(J.of_point(p), J.negate(base)) for p in case.relation_points[1:]]
        for combination in kernel:
            total = J.zero
            for c, one in zip(combination, classes, strict=True):
                total = J.add(total, J.multiple(c, one))
            assert total == J.zero


@pytest.mark.parametrize("name", ["X0p67", "lmfdb13689", "lmfdb2059", "integral_g3", "y2_minus_y_x5_minus_x"])
def test_logarithms_are_additive_and_faithful(name: str) -> None:
    rng = random.Random(7)
    case = reference_case(name)
    for v in case.good_primes(50, 17):
        group = case.oracle(v)
        J = group.J
        a, b = J.random_prime(rng), J.random_prime(rng)
        logs = [group.logarithm(a), group.logarithm(b)]
        assert group.logarithm(J.add(a, J.multiple(3, b))) == group.combination(logs, [1, 3])
        # The points have distinct logarithms, because P - O determines P.
        assert len({group.logarithm(J.of_point(p)) for p in J.points}) == len(J.points)
