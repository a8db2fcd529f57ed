"""Random curves of genus 2 with a Jacobian of rank 1, from an equation to the set of rational points.

y^2 = l x^6 + a x^4 + b x^2 + c with small random coefficients; the ranks of the two elliptic factors are
proved by PARI's 2-descent (equal bounds) to be 1 and 0 in some order.  The generators come from a bounded
search, and a curve is passed over when it finds none.
"""

from __future__ import annotations

import random
from collections.abc import Iterator
from pathlib import Path

import pytest
from cypari import pari

from sieve.curves.hyperelliptic import HyperellipticCurve, SingularCurve
from sieve.curves.search import search_points
from sieve.errors import InputError, SieveError
from tests.support.pipeline import Outcome, pipeline, write_case
from tests.support.sweep import full_sweep

SEED = 20250


def random_curves(seed: int) -> Iterator[HyperellipticCurve]:
    """Curves with proved rank 1, without end."""
    rng = random.Random(seed)
    seen = set()
    while True:
        lead, a, b, c = rng.choice([1, 1, 2, 3, -1, -2]), *(rng.randint(-9, 9) for _ in range(3))
        if c == 0 or (lead, a, b, c) in seen:
            continue
        seen.add((lead, a, b, c))
        try:
            curve = HyperellipticCurve([c, 0, b, 0, a, 0, lead])
        except SingularCurve:
            continue
        total = 0
        for a2, a4, a6 in ((a, lead * b, lead * lead * c), (b, a * c, lead * c * c)):
            lower, upper = (int(n) for n in pari.ellrank(pari.ellinit([0, a2, 0, a4, a6]))[:2])
            total += lower if lower == upper else 100
        if total == 1:
            yield curve


def outcomes(count: int, seed: int, directory: Path) -> tuple[list[tuple[HyperellipticCurve, Outcome]], int]:
    """`count` outcomes, and how many curves were passed over for want of a generator."""
    out: list[tuple[HyperellipticCurve, Outcome]] = []
    passed = 0
    for curve in random_curves(seed):
        if len(out) == count:
            break
        case = write_case(directory, curve.f, (), 1, "PARI's ellrank for both elliptic factors")
        try:
            out.append((curve, pipeline(case)))
        except InputError as error:
            # the case has no generator
            assert "generators" in error.line
            passed += 1
        except SieveError as error:
            raise AssertionError(f"{curve}: {error}") from error
    return out, passed


def check(found: list[tuple[HyperellipticCurve, Outcome]], share: float) -> None:
    decided = without_claim = 0
    for curve, outcome in found:
        points = set(search_points(curve, 400))
        assert points <= outcome.points
        if outcome.proved:
            assert points == outcome.points
        decided += not outcome.open_candidates
        without_claim += not outcome.run.lists[0].rests_on_claim(outcome.run.decisions)
    assert without_claim >= share * len(found)
    assert decided >= share * len(found)


def test_a_few_random_curves(tmp_path: Path) -> None:
    found, _ = outcomes(4, SEED, tmp_path)
    check(found, 0.75)


@pytest.mark.slow
def test_many_random_curves(tmp_path: Path) -> None:
    found, passed = outcomes(300 if full_sweep() else 30, SEED + 1, tmp_path)
    assert passed < len(found)
    check(found, 0.9)
