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
    "field_tables: raise Rejected('field', f'no field of order {size} was found'): left out": (
        "there is always a primitive polynomial"
    ),
    "Disc.__init__: raise Rejected('expansion', 'a residue disc was not expanded'): left out": (
        "Newton's iteration converges in the steps allowed"
    ),
    "Disc.__init__: check == one: now check != one": (
        "the last step of the inverse; its error is below the digits of the corpus, "
        "test_discs_agree_with_the_engine sees it"
    ),
    "Disc.small_roots: need(divide(series, monic, q)[1] == [] and (not any((c % p for c in monic[:m]))), "
    "'roots', 'the zeros of a section were not separated'): left out": (
        "Weierstrass preparation gives this; the lines above it are checked a second time"
    ),
    "Padic.place: need(len(monic) - 1 == inside[i], 'place-roots', "
    "'the points of a place were not separated'): left out": (
        "the zeros of u in a disc are the multiple root of its reduction"
    ),
    "Padic.place: source is not None: now source is None": (
        "saves work alone: what is skipped is subtracted and added again; otherwise more is refused"
    ),
    "Local.vector: origin == k > 0: now origin != k > 0": (
        "relations change by (x, y) -> (x, - 2 x (1, .., 1) - y), which is unimodular: the same index"
    ),
    "insert: i <= j: now i > j": "keeps numbers small alone: pivots are below the modulus anyway",
    "insert: i > j: now i <= j": "keeps numbers small alone",
    "Proof.branch: need(len(total) <= len(self.curve.square), 'factor', 'the factors have another product')"
    ": left out": "saves time alone: the product is compared at the end",
    "Proof.use: len(self.tables) > 400: now len(self.tables) <= 400": "tables that are kept save time alone",
    "Work.spend: raise Declined('more work than this checker does'): left out": (
        "a limit on time alone, tests/proof/test_checker_hostile.py"
    ),
    "decode: raise Declined(f'nesting deeper than {MAX_DEPTH}') from None: left out": (
        "the depth was counted before, tests/proof/test_checker_hostile.py"
    ),
    "Proof.read: raise Declined(f'more than {MAX_RECORDS} records'): left out": (
        "a limit on time alone, tests/proof/test_checker_hostile.py"
    ),
    "lines_of: raise Declined(f'a line beyond {MAX_LINE} bytes or a file beyond {MAX_FILE}'): left out": (
        "a limit on memory alone, tests/proof/test_checker_hostile.py"
    ),
    "Proof.divisor: raise Declined(f'more than {MAX_PLACES} places'): left out": "a limit on time alone",
    "Local.vector: raise Declined('points far from the base'): left out": "a limit on memory alone",
    "apply: raise Declined(f'more than {MAX_CLASSES} classes'): left out": "a limit on memory alone",
    "Zeros.functions: p ** (e + 1) <= length + 1: now p ** (e + 1) > length + 1": (
        "the terms left out matter only where there are as few terms as digits; a section with a zero of "
        "order 2 needs twice as many"
    ),
    "Zeros.disc: (value - v) % p ** depth == 0: now (value - v) % p ** depth != 0": (
        "only in balls where no coefficient is known: they are refused now, or after more subdivision"
    ),
    "Proof.deep_condition: need(known > 0, 'digits', 'too few digits of the logarithms'): left out": (
        "values modulo 1 allow everything, and a negative power is no modulus"
    ),
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
