"""Mutants of the logs, and mutants of the checker."""

from __future__ import annotations

import os

import pytest

from sieve.proof import checker
from tests.support.checker_mutants import CORPUS, expected, mutants, noticed
from tests.support.proof_mutants import Replay, sample, verdict

PER_LOG = 430
"""Mutants of every accepted log; 13 logs."""

FATES = {"accepted": 0, "refused": 0}
ACCEPTED = sorted((CORPUS / "accepted").glob("*.jsonl"))


@pytest.mark.parametrize("path", ACCEPTED, ids=lambda p: p.stem)
def test_mutants_of_logs(path: object) -> None:
    data = path.read_bytes()  # type: ignore[attr-defined]
    replay = Replay(data)
    original = replay.check(data)
    wrong = []
    for mutant in sample(data, PER_LOG, 20261201):
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


HARMLESS: dict[str, str] = {}
"""Beginnings of mutants that no log can notice, and why they are harmless."""


@pytest.mark.slow
def test_mutants_of_the_checker() -> None:
    corpus = expected()
    unnoticed = [name for name, hint, code in mutants() if not noticed(code, hint, corpus)]
    left = [name for name in unnoticed if not any(part in name for part in HARMLESS)]
    assert left == []
