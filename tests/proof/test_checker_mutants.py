"""Mutants of the logs, and mutants of the checker."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from sieve.proof import checker
from tests.support.checker_mutants import CORPUS, expected, mutants, noticed
from tests.support.proof_mutants import Replay, sample, verdict

FATES = {"accepted": 0, "refused": 0}
ACCEPTED = sorted((CORPUS / "accepted").glob("*.jsonl"))


@pytest.mark.parametrize("path", ACCEPTED, ids=lambda p: p.stem)
def test_mutants_of_logs(path: Path) -> None:
    data = path.read_bytes()
    replay = Replay(data)
    original = replay.check(data)
    wrong = []
    for mutant in sample(data, 200 if len(data) < 8000 else 60, 20261201):
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


UNNOTICED = {
    "Field.__init__: raise Rejected('field', f'no field of order {self.size} "
    "was found'): left out": "there is always a primitive polynomial",
    "Disc.__init__: raise Rejected('expansion', 'a residue disc was not "
    "expanded'): left out": "Newton's iteration converges in the steps allowed",
    "Disc.__init__: need(start % p != 0, 'expansion', 'a residue disc was "
    "not expanded'): left out": "the curve is smooth there; the next line inverts the number",
    "Disc.differentials: (self.chart > 0) != self.vertical: now (self.chart "
    "> 0) == self.vertical": "all logarithms change their sign",
    "Disc.differentials: self.chart > 0: now self.chart <= 0": "all logarithms change their sign",
    "Padic.small_roots: need(divide(series, monic, q)[1] == [] and (not "
    "any((c % p for c in monic[:m]))), 'roots', 'the zeros of a section were "
    "not separated'): left out": (
        "Weierstrass preparation gives this; the lines above it are checked a second time"
    ),
    "Place.__init__: limit(small, 'a place of too large a height or "
    "degree'): left out": "a limit on time alone: the work is counted as well",
    "Local.__init__: limit(self.width * self.points <= MAX_ENTRIES, 'too "
    "many points in terms of the base'): left out": "a limit on memory alone",
    "Local.vector: limit(not max(map(abs, row)) >> MAX_BITS, 'points far "
    "from the base'): left out": "a limit on memory alone",
    "Proof.place: limit(len(self.places) < MAX_PLACES, f'more than "
    "{MAX_PLACES} places'): left out": "a limit on time alone",
    "Proof.deep_condition: need(known > 0, 'digits', 'too few digits of the "
    "logarithms'): left out": "groups of order 1 say nothing, and no integer is a modulus below",
    "Zeros.functions: p ** (e + 1) <= length + 1: now p ** (e + 1) > length + 1": (
        "a bound for what is beyond the terms, which are many more than the digits"
    ),
    "Reduction.__init__: curve.weight > 1 (2): now curve.weight <= 1": "changes the count of work alone",
    "Zeros.disc: (value - v) % p ** depth == 0: now (value - v) % p ** depth "
    "!= 0": "tells earlier alone that nothing is known of a ball; it is refused later",
    "insert: i <= j: now i > j": "keeps numbers small alone: pivots are below the modulus anyway",
    "insert: i > j: now i <= j": "keeps numbers small alone",
    "Proof.read_branch: need(len(total) <= len(self.curve.square), 'factor', "
    "'the factors have another product'): left out": "saves time alone: the product is compared at the end",
    "Proof.use: len(self.tables) > 400: now len(self.tables) <= 400": "tables that are kept save time alone",
    "Work.spend: limit(self.done <= MAX_WORK, 'more work than this checker "
    "does'): left out": "a limit on time alone, tests/proof/test_checker_hostile.py",
    "decode: raise Declined(f'nesting deeper than {MAX_DEPTH}') from None: "
    "left out": "the depth was counted before, tests/proof/test_checker_hostile.py",
    "Proof.read: limit(self.records <= MAX_RECORDS, f'more than "
    "{MAX_RECORDS} records'): left out": "a limit on time alone, tests/proof/test_checker_hostile.py",
    "lines_of: raise Declined(f'a line beyond {MAX_LINE} bytes or a file "
    "beyond {MAX_FILE}'): left out": "a limit on memory alone, tests/proof/test_checker_hostile.py",
    "apply: limit(len(joined) <= MAX_CLASSES, f'more than {MAX_CLASSES} "
    "classes'): left out": "a limit on memory alone",
    "main: a != '--json': now a == '--json'": "the command line, test_accepted_alone",
    "main: len(paths) != 1: now len(paths) == 1": "the command line, test_accepted_alone",
    "main: '--json' in arguments: now '--json' not in arguments": "the command line, test_accepted_alone",
}
"""All mutants that neither the corpus nor the words of its statements notice, and why they are harmless."""


def test_unnoticed_mutants_exist() -> None:
    """No reason outlives the line that it speaks of."""
    assert set(UNNOTICED) - {m.name for m in mutants()} == set()


@pytest.mark.slow
def test_checks_of_the_checker_are_needed() -> None:
    """Every sixth mutant of both kinds; `python -m tests.support.checker_mutants` tries all of them."""
    corpus = expected()
    unnoticed = {m.name for m in mutants()[::6] if m.name not in UNNOTICED and not noticed(m, corpus)}
    assert unnoticed == set()
