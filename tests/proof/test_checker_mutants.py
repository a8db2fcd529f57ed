"""Mutants of the logs, and mutants of the checker."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from sieve.proof import checker
from tests.support.checker_mutants import CORPUS, expected, mutants, noticed
from tests.support.proof_mutants import Replay, sample, verdict

MANY = {
    "closed_point",
    "empty_by_classes",
    "odd_degree_at_three",
    "residue_characteristic_two",
    "stated_index",
    "torsion",
}
"""Small logs, of which 620 mutants are checked; 180 of the others."""

FATES = {"accepted": 0, "refused": 0}
ACCEPTED = sorted((CORPUS / "accepted").glob("*.jsonl"))


@pytest.mark.parametrize("path", ACCEPTED, ids=lambda p: p.stem)
def test_mutants_of_logs(path: Path) -> None:
    data = path.read_bytes()
    replay = Replay(data)
    original = replay.check(data)
    wrong = []
    for mutant in sample(data, 620 if path.stem in MANY else 180, 20261201):
        try:
            proof = replay.check(mutant.data)
        except (checker.Fault, checker.Declined):
            FATES["refused"] += 1
            continue
        FATES["accepted"] += 1
        if not verdict(original, proof):
            wrong.append(mutant.what)
    assert wrong == []


def test_number_of_mutants() -> None:
    if "PYTEST_XDIST_WORKER" in os.environ or not FATES["refused"]:
        pytest.skip("the mutants ran elsewhere")
    assert sum(FATES.values()) >= 5000
    assert FATES["accepted"] < FATES["refused"] // 10


HARMLESS = {
    'Rejected("field"': "there is always a primitive polynomial",
    'Rejected("expansion"': "Newton's iteration converges; the result is used only if it was verified",
    '"roots", "the zeros': "Weierstrass preparation gives this; the lines above it are checked a second time",
    '"place-roots"': "the zeros of u in a disc are the multiple root of its reduction",
    "divide(series, monic, q)": "continuation of the refusal `roots`",
    '"terms", f"': "fewer terms than digits and no section; small_roots refuses the rest before",
    "more work than": "a limit, tests/proof/test_checker_hostile.py",
    "nesting deeper": "the depth was counted before",
    "MAX_RECORDS": "a limit, tests/proof/test_checker_hostile.py",
    "MAX_LINE": "a limit, tests/proof/test_checker_hostile.py",
    "MAX_PLACES": "a limit on time alone",
    "points far from": "a limit on memory alone",
    "MAX_CLASSES": "a limit on memory alone",
    "len(total) <= len(self.curve.square)": "saves time alone: the product is compared at the end",
}
"""Parts of mutants that no log of the corpus notices, and why they are harmless."""


@pytest.mark.slow
def test_refusals_of_the_checker_are_needed() -> None:
    """Every sixth mutant without a refusal; all of them, and negated comparisons, by the module's main."""
    corpus = expected()
    chosen = [m for m in mutants() if ": without: " in m[0]][::6]
    unnoticed = [name for name, hint, code in chosen if not noticed(code, hint, corpus)]
    assert [name for name in unnoticed if not any(part in name for part in HARMLESS)] == []
