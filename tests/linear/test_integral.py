"""Integral points: conditions, verdicts, and two published sets."""

from __future__ import annotations

import io
import json
from math import isqrt
from pathlib import Path

import numpy as np
import pytest

from sieve.commands import run as run_command
from sieve.curves.divisors import Divisor, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.files.resolve import read_case
from sieve.files.store import problem_key
from sieve.local.picard import picard_group
from sieve.local.records import local_record
from sieve.proof import checker
from tests.linear.test_linear_chabauty import known
from tests.support.reference_cases import reference_case
from tests.support.run_files import write_case, write_json
from tests.support.zero_proof_cases import all_discs, with_lines

PUBLISHED = {
    # Balakrishnan, Besser, Mueller 2015 (arXiv 1504.07040), by the reference file; in the disc of each point
    # at p there is no other one
    "integral_g2": (5, 7),
    "integral_g3": (23,),
}


def integral_case(name: str, directory: Path) -> Path:
    return with_lines(write_case(reference_case(name), directory), "integral = true")


@pytest.mark.parametrize(("name", "p"), [(name, p) for name, primes in PUBLISHED.items() for p in primes])
def test_published_sets(name: str, p: int, tmp_path: Path) -> None:
    """Every other affine disc at p is proved to hold no integral point; each of these holds one at most."""
    path = integral_case(name, tmp_path)
    points = [q for q in read_case(path).known_points if q[2] == 1]
    done = run_command.execute(str(path), [str(all_discs(path, p, points))], bound=200)
    assert [d.verdict for d in done.decisions if d.verdict == "open"] == []
    assert run_command.statement(done).startswith(f"X(Z) has exactly {len(points)} points")
    result = run_command.write_files(done, tmp_path / "out")
    assumed = [premise.id for premise in result.premises if premise.status == "assumed"]
    assert assumed[0] == "rank" and len(assumed) == 1 + len(points)
    proof = checker.check(io.BytesIO((tmp_path / "out" / "proof.jsonl").read_bytes()))
    assert proof.integral and set(proof.points) == set(points) and proof.conclusion == "points"
    assert "X(Z) has exactly" in checker.statement(proof)
    assert f"every affine residue disc at {p}" in result.statement.lower()
    assert "Integral points: " in (tmp_path / "out" / "report.txt").read_text("utf-8")


@pytest.mark.parametrize("name", sorted(PUBLISHED))
def test_no_other_small_integral_points(name: str) -> None:
    """All x up to 20000 in absolute value."""
    case = reference_case(name)
    found = set()
    for x in range(-20000, 20001):
        value = 0
        for c in reversed(case.f):
            value = value * x + c
        if value >= 0 and isqrt(value) ** 2 == value:
            found |= {(x, isqrt(value), 1), (x, -isqrt(value), 1)}
    assert found == {p for p in known(case) if p[2] == 1}


@pytest.mark.parametrize("v", [3, 5, 7, 11, 13, 17])
def test_conditions_allow_affine_points_only(v: int) -> None:
    """The classes of all points less those at infinity; (-2/9, ..) is at infinity modulo 3."""
    case = reference_case("integral_g2")
    curve = HyperellipticCurve(case.f, case.h)
    base = _base(curve)
    every = local_record(curve, base, [], v)
    affine = local_record(curve, base, [], v, True)
    assert every.order == affine.order and every.points == affine.points
    group = picard_group(curve.modulo(v))
    allowed = {tuple(row) for row in affine.allowed}
    assert allowed < {tuple(row) for row in every.allowed}
    for point in known(case):
        number = group.curve.index_of(*point)
        row = np.array(group.point_logs[number]) - group.point_logs[group.curve.index_of(1, 0, 0)]
        inside = tuple(row % np.array(group.invariants)) in allowed
        assert inside == (number < group.curve.affine_count)
    assert group.curve.index_of(-2, 723, 9) >= group.curve.affine_count or v != 3


def _base(curve: HyperellipticCurve) -> Divisor:
    return Divisor.of([(1, RationalPlace(curve.normalise(1, 0, 0)))])


def test_points_that_are_not_integral(tmp_path: Path) -> None:
    """A candidate near (-2/9, 241/243) is eliminated, one in a disc at infinity without any sieve."""
    path = integral_case("integral_g2", tmp_path)
    entries: list[dict[str, object]] = [
        {"id": "near", "point": "(-2 : 723 : 9)"}, {"id": "far", "disc": "(1 : 0 : 0)"},
        {"id": "one", "point": "(0, 1)"},
    ]
    listing = write_json(tmp_path / "c.json", 7, 8, entries, False)
    done = run_command.execute(str(path), [str(listing)], bound=100)
    near, far, one = done.decisions
    assert near.verdict == "eliminated" and 3 in near.primes
    assert far.verdict == "eliminated" and not far.primes and far.reason.startswith("not integral")
    assert one.verdict == "rational" and one.given
    assert all(point[2] == 1 for point in run_command.rational_points(done))
    run_command.write_files(done, tmp_path / "out")
    proof = checker.check(io.BytesIO((tmp_path / "out" / "proof.jsonl").read_bytes()))
    assert [c.id for c in proof.fates if c.verdict == "eliminated"] == ["near", "far"]
    # the same question about rational points has another answer
    text = path.read_text("utf-8").replace("integral = true\n", "")
    path.write_text(text, "utf-8")
    rational = run_command.execute(str(path), [str(tmp_path / "c.json")], bound=100)
    assert [d.verdict for d in rational.decisions] == ["rational"] * 3


def test_the_store_keeps_both_kinds_apart() -> None:
    case = reference_case("integral_g2")
    curve = HyperellipticCurve(case.f, case.h)
    base = _base(curve)
    assert problem_key(curve, base, [base]) != problem_key(curve, base, [base], True)


def test_an_incomplete_list_of_discs_proves_nothing(tmp_path: Path) -> None:
    """Without the disc of the first point, or without the bounds, there is no conclusion."""
    path = integral_case("integral_g2", tmp_path)
    points = [q for q in read_case(path).known_points if q[2] == 1]
    for listing in (all_discs(path, 5, points, leave_out=1), all_discs(path, 5)):
        done = run_command.execute(str(path), [str(listing)], bound=100)
        assert "exactly" not in run_command.statement(done)
        run_command.write_files(done, tmp_path / "out")
        text = (tmp_path / "out" / "proof.jsonl").read_text("utf-8")
        assert json.loads(text.splitlines()[-1])["conclusion"] == "none"
