"""Candidates that the usual primes leave open: primes found for them, explanations, any number of jobs."""

from __future__ import annotations

import json

import pytest

from sieve.commands.common import workers
from sieve.commands.run import execute
from tests.support.reference_cases import reference_case

CASE = """format = "sieve-case/1"
name = "pursuit"
known_points = {points}

[curve]
equation = "{equation}"

[jacobian]
rank = 2
rank_source = "the reference file"
base = "{base}"
generators_from = "known_points"
"""


def write(tmp_path, prime, candidates, digits):
    """A bielliptic curve with many small group orders, and candidates at one prime."""
    case = reference_case("bielliptic_x6_x2_1")
    points = [f"({x} : {y} : {z})" for x, y, z in case.known_points]
    text = CASE.format(points=json.dumps(points), equation=case.equation, base=points[0])
    (tmp_path / "case.toml").write_text(text)
    listed = [{"id": name, "point": point} for name, point in candidates.items()]
    (tmp_path / "c.json").write_text(json.dumps({
        "format": "sieve-candidates/1", "prime": prime, "precision": digits, "complete": False,
        "source": "a test", "candidates": listed}))
    return str(tmp_path / "case.toml"), [str(tmp_path / "c.json")]


def square_root(value, p, n, near):
    y = near
    for _ in range(n):
        y = (y - (y * y - value) * pow(2 * y, -1, p**n)) % p**n
    return y


def near_a_known_point(p, n, digits, unit):
    """The point of y^2 = x^6 + x^2 + 1 whose x is p^digits * unit, y near 1: in the disc of (0, 1)."""
    x = p**digits * unit
    return x, square_root(x**6 + x**2 + 1, p, n, 1)


def test_a_candidate_that_shares_two_digits_is_open_until_a_useful_prime_is_allowed(tmp_path):
    x, y = near_a_known_point(7, 6, 2, 3)
    case, files = write(tmp_path, 7, {"z": f"({x} + O(7^6), {y} + O(7^6))", "k": "(0 : 1 : 1)"}, 6)
    first = {d.id: d for d in execute(case, files, bound=400).decisions}
    assert first["k"].verdict == "rational" and first["z"].verdict == "open"
    assert "7^2" in first["z"].reason and "v = 467 is expected to help" in first["z"].hint
    second = {d.id: d for d in execute(case, files, bound=468).decisions}
    assert second["k"].verdict == "rational" and second["z"].verdict == "eliminated"
    assert second["z"].primes == (467,)


@pytest.mark.slow
def test_beyond_the_usual_bounds_only_useful_primes_are_looked_at(tmp_path):
    x, y = near_a_known_point(7, 6, 2, 1)
    case, files = write(tmp_path, 7, {"z": f"({x} + O(7^6), {y} + O(7^6))", "k": "(0 : 1 : 1)"}, 6)
    with workers(2) as executor:
        run = execute(case, files, bound=1300, executor=executor)
    found = {d.id: d for d in run.decisions}["z"]
    assert found.verdict == "eliminated" and found.primes == (1249,)
    record = run.investigation.records[1249]
    assert record.invariants[-1] % 49 == 0
    beyond = [v for v in run.investigation.records if v > 1000]
    assert len(beyond) < 20
    alone = execute(case, files, bound=1300)
    assert [d.verdict for d in alone.decisions] == [d.verdict for d in run.decisions]
    assert sorted(alone.investigation.records) == sorted(run.investigation.records)


def test_a_quadratic_point_is_recognised_and_named(tmp_path):
    """(i, i) lies on the curve: i^6 + i^2 + 1 = -1."""
    i = square_root(-1, 5, 10, 2)
    case, files = write(tmp_path, 5, {"z": f"({i} + O(5^10), {i} + O(5^10))"}, 10)
    (decision,) = execute(case, files, primes=[11]).decisions
    assert decision.verdict == "open"
    assert "t^2 + 1 = 0" in decision.reason and "(t, t)" in decision.reason


def test_the_power_that_is_missing_is_named(tmp_path):
    x, y = near_a_known_point(7, 6, 3, 2)
    case, files = write(tmp_path, 7, {"z": f"({x} + O(7^4), {y} + O(7^4))"}, 4)
    (decision,) = execute(case, files, bound=150).decisions
    assert decision.verdict == "open"
    assert "7^3 are needed, and none below 150 does" in decision.reason
