"""The reference curves of rank 4 and 6 run: local data, saturation, surviving classes."""

from __future__ import annotations

import pytest

from sieve.engine.verdicts import surviving_classes
from tests.support.problems import investigate, known_point_problem
from tests.support.reference_cases import reference_case
from tests.support.sweep import full_sweep


def run(name: str, bound: int) -> None:
    problem = known_point_problem(reference_case(name))
    investigation = investigate(problem, bound)
    assert investigation.size == problem.rank
    assert investigation.torsion_proved()
    assert all(investigation.saturation_at(ell).proved for ell in (3, 5, 7))
    at_two = investigation.saturation_at(2)
    # the difference of the points at infinity of the first curve is twice another class
    assert at_two.proved == (name != "lmfdb440509")
    if not at_two.proved:
        assert at_two.combination is not None and any(at_two.combination)
        assert 2 not in investigation.allowed_ells()
    outlook = surviving_classes(investigation, investigation.allowed_ells(), bound)
    relation = outlook.outcome.relation
    assert not outlook.empty and relation.index > 1 and 0 < relation.count < relation.index
    # every known point is in a surviving class
    for coordinates in investigation.coordinates.values():
        assert coordinates.denominator == 1 and relation.contains(coordinates.vector)


@pytest.mark.parametrize("name", ["lmfdb440509", "y2_minus_y_x5_minus_x"])
def test_rank_three_and_four(name: str) -> None:
    run(name, 200)


@pytest.mark.slow
def test_rank_six() -> None:
    run("binomial_y2_x5", 500 if full_sweep() else 250)
