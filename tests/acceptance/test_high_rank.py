"""The reference curves of rank 3 to 6: local data, saturation, surviving classes, indices above 10^20."""

from __future__ import annotations

import re
from math import log

import pytest

from scripts.high_rank import main
from sieve.engine.depth_first import climb
from sieve.engine.higher import climb_further
from sieve.engine.staged import plan_ladder
from sieve.engine.verdicts import surviving_classes
from tests.support.high_rank import FURTHER, TOPS, down_to_known, gather, proved
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


def climb_to(name: str, bound: int, index: float, rest: float = 1e-3):
    """All classes up to the index; the known points must pass every filter."""
    investigation, relations = gather(name, bound)
    ladder = plan_ladder(relations, proved(investigation, TOPS), log(index), rest=rest)
    known = [c.vector for c in investigation.coordinates.values()]
    result = climb(relations, ladder, known=known)
    assert result.relation.index >= index and all(map(result.relation.contains, known))
    return investigation, relations, known, ladder, result


def test_rank_three_beyond_ten_to_the_twenty() -> None:
    investigation, relations, known, _, result = climb_to("y2_minus_y_x5_minus_x", 6000, 1e22)
    alone = down_to_known(result.relation, known)
    assert len(known) == alone.count == 17 and alone.index >= 10**20
    more = proved(investigation, FURTHER)
    further, _ = climb_further(relations, result.relation, more, log(1e15), known=known)
    assert further.index > 10**35 and 17 <= further.count < 100 and all(map(further.contains, known))
    assert down_to_known(further, known).index > 10**30


def test_the_script_says_what_is_left(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["y2_minus_y_x5_minus_x", "--bound", "2000"]) == 0
    *_, line, last = capsys.readouterr().out.splitlines()
    found = re.fullmatch(r"(\d+) classes are left modulo a subgroup of index (\d+) = .*, 17 of them .*", line)
    # classes near one known point at some primes and near another elsewhere need more primes than these
    assert found and 17 < int(found[1]) < 60 and int(found[2]) >= 10**20
    assert re.fullmatch(r"modulo a subgroup of index \d+ = 10\^\d+\.\d none but these", last)


@pytest.mark.slow
def test_rank_six_beyond_ten_to_the_twenty() -> None:
    full = full_sweep()
    _, _, known, ladder, result = climb_to("binomial_y2_x5", 40_000 if full else 300,
                                           1e20 if full else 2e6, 1e-3 if full else 1e9)
    assert len(known) == 39 and result.halved
    if full:
        alone = down_to_known(result.relation, known)
        assert alone.count == 39 and alone.index > 10**20 and result.relation.count < 100
    # sizes are those that the counts foretell (one of each pair is followed)
    sizes = [*result.sizes[1:], result.relation.count // 2]
    ends = [(lift, 2 * met) for lift, met in zip(ladder, sizes, strict=True) if lift.last and met > 500]
    assert ends
    for lift, met in ends:
        assert abs(log(met) - lift.log_size) < log(2)
