"""Proof logs that count zeros: accepted with the rank as the only premise, and nothing may be left out."""

from __future__ import annotations

import io
import json
from pathlib import Path
from typing import Any

import pytest

from sieve.commands import candidates
from sieve.commands import run as run_command
from sieve.proof import checker
from tests.linear.test_linear_chabauty import known
from tests.support import pipeline
from tests.support.reference_cases import reference_case
from tests.support.zero_proof_cases import ZERO_CASES, all_discs, chabauty_list


def check(records: list[dict[str, Any]]) -> checker.Proof:
    """The checker's view of a log, its number of records corrected."""
    records[-1]["records"] = len(records) - 1
    lines = [json.dumps(record, separators=(",", ":")) + "\n" for record in records]
    return checker.check(io.BytesIO("".join(lines).encode()))


def records_of(path: Path) -> list[dict[str, Any]]:
    return [json.loads(line) for line in path.read_text("utf-8").splitlines()]


@pytest.fixture(scope="module")
def logs(tmp_path_factory: pytest.TempPathFactory) -> dict[str, list[dict[str, Any]]]:
    """The records of the logs."""
    names = ["zeros", "zeros_rank_zero", "zeros_double", "zeros_integral"]
    return {name: records_of(ZERO_CASES[name](tmp_path_factory.mktemp(name))) for name in names}


@pytest.mark.parametrize(
    ("log", "name", "integral"),
    [("zeros", "quadratic_period_5", False), ("zeros_rank_zero", "X1_13", False),
     ("zeros_integral", "quadratic_period_5", True)],
)
def test_the_rank_is_the_only_premise(
    logs: dict[str, list[dict[str, Any]]], log: str, name: str, integral: bool
) -> None:
    """The published rational points, and the integral ones among them."""
    proof = check(logs[log])
    assert list(proof.premises) == ["rank"] and proof.conclusion == "points"
    published = {p for p in known(reference_case(name)) if p[2] == 1 or not integral}
    assert set(proof.points) == published


def test_double_zeros_at_rational_points(logs: dict[str, list[dict[str, Any]]]) -> None:
    """Two zeros on a ball, both at its rational point: the differential is known exactly."""
    records = logs["zeros_double"]
    proof = check(records)
    (found,) = proof.zeros.values()
    assert 2 in {found.bounds[name] for name in found.central}
    assert proof.conclusion == "points" and list(proof.premises) == ["rank"]
    # nothing is exact any more
    changed = [r | {"annihilators": [[3**6, 1]]} if r["kind"] == "zeros" else r for r in map(dict, records)]
    with pytest.raises(checker.Rejected):
        check(changed)


@pytest.mark.parametrize("log", ["zeros", "zeros_rank_zero", "zeros_double", "zeros_integral"])
def test_no_candidate_can_be_left_out(logs: dict[str, list[dict[str, Any]]], log: str) -> None:
    """Every list is shortened by each of its candidates in turn."""
    records = logs[log]
    for candidate in [r for r in records if r["kind"] == "candidate"]:
        if log == "zeros_integral" and candidate["point"][2] != 1:
            continue
        key = (candidate["prime"], candidate["id"])
        shorter = [dict(r) for r in records if (r.get("prime"), r.get("id")) != key]
        shorter[-1]["eliminated"] = [pair for pair in shorter[-1]["eliminated"] if tuple(pair) != key]
        with pytest.raises(checker.Rejected) as error:
            check(shorter)
        assert error.value.code == "zeros-open"


@pytest.mark.parametrize(("name", "p"), [("lmfdb2059", 7), ("X0_37", 5), ("quadratic_period_5", 7)])
def test_engine_and_checker_count_alike(name: str, p: int, tmp_path: Path) -> None:
    """Two programs that share no code: the same bounds, for points and for whole discs."""
    case = reference_case(name)
    path = pipeline.write_case(tmp_path, case.f, case.h, int(case.rank or 0), "the reference data")
    for listing in (chabauty_list(path, p, 6), all_discs(path, p)):
        done = run_command.execute(str(path), [str(listing)], bound=100)
        run_command.write_files(done, tmp_path)
        proof = check(records_of(tmp_path / "proof.jsonl"))
        counted = done.lists[0].proof
        assert counted is not None and counted.complete
        assert proof.zeros[p].bounds == {b.id: b.at_most for b in counted.bounds}


def test_a_claim_that_is_not_needed_is_no_premise(tmp_path: Path) -> None:
    """The list of `sieve candidates` claims to be complete: it is proved, in result and log."""
    case = reference_case("X0_37")
    path = pipeline.write_case(tmp_path, case.f, case.h, 1, "the reference data")
    done = pipeline.pipeline(path, 3)
    result = run_command.result_of(done.run)
    (premise,) = [p for p in result.premises if p.id == "complete at 3"]
    assert premise.status == "proved" and "zeros of annihilating integrals" in premise.statement
    assert [p.id for p in result.premises if p.status == "assumed"] == ["rank"]
    assert "counting zeros" in result.statement


def test_a_list_with_too_high_multiplicities_keeps_its_claim(tmp_path: Path) -> None:
    """Without exactness a ball with two zeros may hide a point: the claim stays a premise, or it is open."""
    case = reference_case("quadratic_period_5")
    path = pipeline.write_case(tmp_path, case.f, case.h, 1, "the reference data")
    found = candidates.execute(str(path), prime=3, precision=1)
    document = candidates.candidate_document(found)
    assert any(c["multiplicity"] == 2 for c in document["candidates"])
    for claimed in (True, False):
        file = tmp_path / f"{claimed}.json"
        file.write_text(json.dumps(document | {"complete": claimed}), "utf-8")
        done = run_command.execute(str(path), [str(file)], bound=100)
        by_id = {d.id: d for d in done.decisions}
        for c in document["candidates"]:
            assert by_id[c["id"]].verdict == "rational"
            # two rational points are near, and two zeros are possible: these are all
            assert by_id[c["id"]].sole == (len(by_id[c["id"]].points) == c["multiplicity"])


def test_no_candidates_at_all(tmp_path: Path) -> None:
    """y^2 = 2 x^6 + 8 x^4 + 6 x^2 + 8, rank 1 by PARI's ellrank: no common zero modulo 13, so no point."""
    path = pipeline.write_case(tmp_path, [8, 0, 6, 0, 8, 0, 2], (), 1, "elliptic factors, by PARI")
    done = pipeline.pipeline(path, 13)
    assert done.run.lists[0].candidates == [] and not done.run.lists[0].rests_on_claim([])
    assert run_command.statement(done.run).startswith("X(Q) is empty. (The annihilating integrals at 13")
    run_command.write_files(done.run, tmp_path / "out")
    proof = check(records_of(tmp_path / "out" / "proof.jsonl"))
    assert (proof.conclusion, list(proof.premises)) == ("empty", ["rank"])
    assert "No rational point is in a residue disc at 13" in checker.statement(proof)
