"""Points modulo q^2: the images of known points are among the allowed classes, few others are."""

from __future__ import annotations

import io
from pathlib import Path

import numpy as np
import pytest

from sieve.commands import run as run_command
from sieve.commands.common import problem_of
from sieve.curves.divisors import Divisor, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.search import search_points
from sieve.engine.investigation import Investigation
from sieve.engine.relation import relation_from_condition
from sieve.files.resolve import read_case
from sieve.local.deep import DEEP_PRIMES, deep_condition
from sieve.proof import checker
from tests.support.reference_cases import reference_case
from tests.support.run_files import write_candidates, write_case


def investigation(name: str, directory: Path) -> Investigation:
    found = Investigation(problem_of(read_case(write_case(reference_case(name), directory))))
    found.establish()
    return found


@pytest.mark.parametrize("name", ["X0p67", "integral_g2", "integral_g3", "bielliptic_x6_x2_1"])
def test_known_points_are_allowed(name: str, tmp_path: Path) -> None:
    """In the group of the condition, through their integer coordinates on the generators."""
    found = investigation(name, tmp_path)
    problem, tried = found.problem, 0
    for q in DEEP_PRIMES:
        if not problem.curve.is_smooth(q):
            continue
        condition = deep_condition(problem.curve, problem.base, found.generators, q)
        moduli = np.array(condition.moduli, dtype=np.int64)
        allowed = {tuple(int(c) for c in row) for row in condition.allowed}
        images = np.array(condition.images, dtype=np.int64)
        for point in found.coordinates.values():
            if point.denominator == 1:
                value = np.array(point.vector, dtype=np.int64) @ images % moduli
                assert tuple(int(c) for c in value) in allowed
                tried += 1
        reduced = problem.curve.modulo(q)
        assert reduced.count < condition.count <= q * reduced.count
    assert tried > 5


def test_it_says_more_than_reduction(tmp_path: Path) -> None:
    """The density of the classes drops by about q^(g-1), and never rises."""
    found = investigation("integral_g2", tmp_path)
    problem, ells = found.problem, [2, 3, 5]
    for q in (3, 5):
        flat = relation_from_condition(found.records[q].condition(found.images(found.records[q])), ells)
        condition = deep_condition(problem.curve, problem.base, found.generators, q)
        deep = relation_from_condition(condition, ells)
        assert deep.index % flat.index == 0 and deep.index > flat.index
        assert deep.count * flat.index * (q - 1) < 2 * flat.count * deep.index


def test_integral_points_only(tmp_path: Path) -> None:
    found = investigation("integral_g2", tmp_path)
    problem = found.problem
    every, affine = (deep_condition(problem.curve, problem.base, [], 5, flag) for flag in (False, True))
    assert {tuple(r) for r in affine.allowed} < {tuple(r) for r in every.allowed}


def test_points_of_the_curve_modulo_the_square() -> None:
    """Every rational point of height below 30 with good reduction, as P - B itself."""
    case = reference_case("X0p67")
    curve = HyperellipticCurve(case.f, case.h)
    points = search_points(curve, 30)
    base = Divisor.of([(1, RationalPlace(points[0]))])
    differences = [Divisor.of([(1, RationalPlace(point))]) - base for point in points[1:]]
    condition = deep_condition(curve, base, differences, 5)
    allowed = {tuple(int(c) for c in row) for row in condition.allowed}
    assert len(points) > 5 and all(tuple(row) in allowed for row in condition.images)


def test_logs_with_deep_conditions(tmp_path: Path) -> None:
    """Few auxiliary primes: the conditions modulo q^2 are used, and the checker finds the same classes."""
    path = write_case(reference_case("integral_g2"), tmp_path)
    done = run_command.execute(str(path), [], primes=[3, 5, 7, 11, 13])
    assert done.investigation.deep
    run_command.write_files(done, tmp_path / "out")
    text = (tmp_path / "out" / "proof.jsonl").read_bytes()
    assert b'["deep ' in text
    proof = checker.check(io.BytesIO(text))
    assert done.outlook is not None and proof.count == done.outlook.outcome.relation.count


def test_at_the_prime_of_an_incomplete_list(tmp_path: Path) -> None:
    """Such a list says nothing of other points: those modulo p^2 are a condition for the candidates at q."""
    case = write_case(reference_case("integral_g2"), tmp_path)
    reference = reference_case("integral_g2")
    lists = [str(write_candidates(reference, tmp_path, p, 3, 8, complete=False)) for p in (3, 5)]
    done = run_command.execute(str(case), lists, primes=[3, 5, 7, 11])
    assert {3, 5} <= set(done.investigation.deep)
    run_command.write_files(done, tmp_path / "out", full_proof=True)
    proof = checker.check(io.BytesIO((tmp_path / "out" / "proof.jsonl").read_bytes()))
    assert {3, 5} <= set(proof.padics)
    assert proof.deep_condition("deep 3").allowed and proof.deep_condition("deep 5").allowed
