"""Plane quartics: random p-adic points die, known and planted points never, every log is accepted."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from sieve.engine.investigation import Investigation
from sieve.exact.primes import primes_below
from tests.support.command_line import sieve
from tests.support.plane_cases import quartic_case, quartic_problem, write_plane_candidates, write_quartic
from tests.support.planted_quartics import sweep_quartics
from tests.support.power import power
from tests.support.sweep import full_sweep

PRIMES = {
    "level13_split": 7, "level13_S4": 5, "X0p97": 7, "X0p113": 7, "X0p139": 11, "X0p151": 7, "X0p239": 3,
}  # fmt: skip
"""For each quartic of rank 3 a p at which the auxiliary primes below 2000 tell most random points."""


def eliminated(name: str, p: int, bound: int) -> int:
    """How many of 40 random p-adic points are eliminated among the known points."""
    investigation = Investigation(quartic_problem(quartic_case(name)), expressible=True)
    investigation.establish(investigation.gather)
    investigation.gather(primes_below(bound))
    found = power(investigation, p, bound, 40)
    assert found.total == 40 and found.known_lost == 0
    return found.eliminated


def test_most_random_points_die() -> None:
    assert eliminated("X0p239", 3, 400) >= 30


@pytest.mark.slow
@pytest.mark.parametrize("name", sorted(PRIMES))
def test_random_points_die_on_every_quartic(name: str) -> None:
    assert eliminated(name, PRIMES[name], 2000) >= 34


@pytest.mark.slow
@pytest.mark.parametrize("name", sorted(PRIMES))
def test_every_log_is_accepted(name: str, tmp_path: Path) -> None:
    case = write_quartic(quartic_case(name), tmp_path)
    count, bound = (40, "2000") if full_sweep() else (6, "300")
    candidates = write_plane_candidates(case, tmp_path / "c.json", PRIMES[name], 6, count, complete=False)
    done = sieve("run", case, "-c", candidates, "-o", tmp_path / "out", "--bound", bound, "--json")
    assert done.code in (0, 1), done.err
    data = json.loads(done.out)
    known = len(quartic_case(name).known_points)
    assert [v["verdict"] for v in data["verdicts"][:known]] == ["rational"] * known
    checked = sieve("check", tmp_path / "out" / "proof.jsonl", "--json")
    assert checked.code == 0
    assert len(json.loads(checked.out)["eliminated"]) == data["counts"]["eliminated"]


def check(seed: str, curves: int) -> None:
    tally = sweep_quartics(seed, curves)
    assert not tally.wrong
    counts = tally.counts
    refused = sum(n for name, n in counts.items() if name.startswith("refused: "))
    assert counts["quartics"] == curves - refused
    # the sweep did what it is for: planted points met the sieve, random ones died in it
    assert 2 * (counts["point open"] + counts["disc open"] + counts["coefficients open"]) >= curves
    assert 2 * counts["random eliminated"] >= curves
    assert counts["logarithms"] >= 2 * curves


@pytest.mark.parametrize("block", range(2))
def test_planted_points_survive(block: int) -> None:
    check(f"short {block}", 4)


@pytest.mark.slow
@pytest.mark.parametrize("block", range(26))
def test_planted_points_survive_at_length(block: int) -> None:
    check(f"block {block}", 20 if full_sweep() else 4)
