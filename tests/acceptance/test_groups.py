"""J(F_v) on every reference curve: certified, of PARI's order, with the stored structure."""

from __future__ import annotations

import random

import pytest

from sieve.errors import Uncertified
from sieve.local.picard import picard_group
from tests.support.problems import curve_of
from tests.support.reference_cases import ReferenceCase, reference_cases
from tests.support.sweep import full_sweep

CASES = reference_cases()


def compare_orders(case: ReferenceCase, primes: list[int]) -> int:
    """Compare with PARI; returns how many groups were certified."""
    curve = curve_of(case)
    certified = 0
    for v in primes:
        assert curve.is_smooth(v)
        try:
            group = picard_group(curve.modulo(v))
        except Uncertified:
            assert v < 11
            continue
        assert group.order == case.order(v)
        assert all(b % a == 0 for a, b in zip(group.invariants, group.invariants[1:], strict=False))
        certified += 1
    return certified


def good_primes(case: ReferenceCase) -> list[int]:
    """Good primes up to the bound of the acceptance, odd (the reference counts those)."""
    return case.good_primes(1001 if case.genus == 2 else 201, 3)


@pytest.mark.parametrize("case", CASES, ids=lambda c: c.id)
def test_a_few_orders(case: ReferenceCase) -> None:
    primes = [v for v in good_primes(case) if v < 300]
    chosen = sorted({*primes[:3], *random.Random(case.id).sample(primes, 3)})
    assert compare_orders(case, chosen) >= len(chosen) - 2


@pytest.mark.parametrize("case", CASES, ids=lambda c: c.id)
def test_stored_structures(case: ReferenceCase) -> None:
    curve = curve_of(case)
    for record in case.raw.get("jac_structure", []):
        if "J_invariants" in record and (record["p"] < 30 or full_sweep()):
            group = picard_group(curve.modulo(record["p"]))
            assert list(group.invariants) == [d for d in record["J_invariants"] if d > 1]
            assert group.curve.count == record.get("nX", group.curve.count)


@pytest.mark.slow
@pytest.mark.parametrize("case", CASES, ids=lambda c: c.id)
def test_every_order(case: ReferenceCase) -> None:
    primes = good_primes(case)
    if not full_sweep():
        primes = random.Random(f"{case.id} small").sample(primes, 10)
    assert compare_orders(case, primes) >= len(primes) - 3
