"""Random p-adic points are eliminated, known ones never, and what stays open is explained."""

from __future__ import annotations

import pytest

from tests.support.power import power
from tests.support.problems import investigate, known_point_problem, rank_of, with_relations
from tests.support.reference_cases import ReferenceCase, reference_case
from tests.support.sweep import full_sweep

CASES = [case for case in with_relations() if case.genus == 2 and rank_of(case) == 2]
PADIC_PRIMES = (3, 5, 7, 11, 13)
EXPLANATIONS = {"shared", "unseen", "open"}


def sweep(cases: list[ReferenceCase], padic: tuple[int, ...], bound: int, count: int) -> tuple[int, int]:
    """(eliminated, all) over the random points of the cases."""
    eliminated = total = 0
    for case in cases:
        investigation = investigate(known_point_problem(case), bound)
        for p in padic:
            if investigation.problem.curve.is_smooth(p):
                found = power(investigation, p, bound, count)
                assert found.known_lost == 0 and set(found.open_kinds) <= EXPLANATIONS
                assert found.total == count
                eliminated += found.eliminated
                total += found.total
    return eliminated, total


@pytest.mark.parametrize(("name", "p"), [("X0p67", 3), ("X0p67", 11), ("X0p125", 7), ("lmfdb100154", 5)])
def test_most_random_points_die(name: str, p: int) -> None:
    eliminated, total = sweep([reference_case(name)], (p,), 160, 40)
    assert total == 40 and eliminated >= 36


@pytest.mark.slow
def test_all_curves_of_rank_2() -> None:
    """At least 95 in 100 over all curves and primes with the auxiliary primes below 1000."""
    if full_sweep():
        eliminated, total = sweep(CASES, PADIC_PRIMES, 1000, 40)
        assert total >= 2000 and eliminated >= 0.95 * total
    else:
        eliminated, total = sweep(CASES[:3], (3, 11), 400, 40)
        assert eliminated >= 0.9 * total
