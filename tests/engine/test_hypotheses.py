"""Saturation and torsion from reductions, on made-up groups where the truth is known."""

from __future__ import annotations

import itertools
import random
from math import prod

import numpy as np
import pytest

from sieve.engine.hypotheses import saturation, torsion_dimension, torsion_order_bound
from sieve.local.records import LocalRecord


def record(prime: int, invariants: tuple[int, ...], points: int = 9) -> LocalRecord:
    nothing = np.zeros((1, len(invariants)), dtype=np.int64)
    return LocalRecord(prime, points, prod(invariants), invariants, (), nothing, "made up")


def skipped(prime: int) -> LocalRecord:
    return LocalRecord(prime, 0, 0, (), (), np.zeros((0, 0), dtype=np.int64), "", "made up")


@pytest.mark.parametrize("seed", range(40))
def test_injectivity_against_enumeration(seed: int) -> None:
    """Proved exactly when no vector of L/lL but 0 is divisible by l in all groups, and torsion is bounded."""
    rng = random.Random(seed)
    ell, rank = rng.choice([2, 3, 5]), rng.randint(0, 3)
    torsion = [rng.choice([2, 3, 4, 6]) for _ in range(rng.randint(0, 2))]
    rows = list(range(rank)) + [rank + j for j, t in enumerate(torsion) if t % ell == 0]
    records, images = [], []
    for prime in (7, 11, 13, 17)[: rng.randint(1, 4)]:
        small = rng.choice([1, 2, 3, 5])
        invariants = tuple(d for d in (small, small * rng.choice([2, 3, 6, 10, 15, 30])) if d > 1)
        records.append(record(prime, invariants))
        images.append([[rng.randrange(d) for d in invariants] for _ in range(rank + len(torsion))])
    found = saturation(ell, rank, torsion, records, images)
    bound = min(sum(d % ell == 0 for d in r.invariants) for r in records)

    def divisible(vector: tuple[int, ...]) -> bool:
        return all(
            sum(a * image[i][j] for a, i in zip(vector, rows, strict=True)) % ell == 0
            for r, image in zip(records, images, strict=True)
            for j, d in enumerate(r.invariants)
            if d % ell == 0
        )

    kernel = [x for x in itertools.product(range(ell), repeat=len(rows)) if any(x) and divisible(x)]
    claimed = len(rows) - rank
    assert found.proved == (not kernel and bound <= claimed)
    if found.proved:
        # the primes named are enough by themselves
        pairs = [(r, i) for r, i in zip(records, images, strict=True) if r.prime in found.primes]
        assert saturation(ell, rank, torsion, [r for r, _ in pairs], [i for _, i in pairs]).proved
    elif bound <= claimed:
        assert found.combination is not None and "divisible" in found.reason
        assert tuple(found.combination[i] % ell for i in rows) in kernel
        assert all(abs(2 * a) <= ell for a in found.combination)
    else:
        assert found.reason.startswith(f"J(Q)[{ell}] may have dimension {bound}")


def test_multiples_of_a_generator_are_never_saturated() -> None:
    rng = random.Random(5)
    for ell in (2, 3, 5, 7):
        records = [record(v, (ell * ell, ell**3 * 6)) for v in (11, 13, 17, 19, 23)]
        images = []
        for r in records:
            first = [rng.randrange(d) for d in r.invariants]
            images.append([[ell * a % d for a, d in zip(first, r.invariants, strict=True)], [1, 1]])
        found = saturation(ell, 2, [ell] * 2, records, [[*i, [0, 0], [0, 0]] for i in images], 2)
        assert not found.proved


def test_torsion_bounds() -> None:
    records = [skipped(3), record(2, (2, 2, 6)), record(5, (2, 12)), record(7, (30,)), record(11, (), 0)]
    assert torsion_dimension(2, records).dimension == 1 and torsion_dimension(2, records).primes == (7,)
    assert torsion_dimension(3, records).dimension == 1
    # the residue characteristic 2 says nothing about torsion of order 2
    assert torsion_dimension(2, records[:2]).dimension > 100
    assert torsion_dimension(3, records[:2]).primes == (2,)
    # known exactly from the factors of the sextic
    assert torsion_dimension(2, records, 0).dimension == 0 and torsion_dimension(2, records, 0).primes == ()
    assert torsion_order_bound(2, records) == 1 and torsion_order_bound(3, records) == 1
    assert torsion_order_bound(2, [record(5, (4, 4)), record(7, (2, 8))]) == 3
    assert torsion_order_bound(2, [record(5, (4, 4)), record(7, (64,))]) == 2
    assert torsion_order_bound(5, records) == 0


def test_primes_without_points_or_data_are_left_out() -> None:
    records = [skipped(3), record(5, (), 0), record(7, (3,))]
    images: list[list[list[int]]] = [[], [[]], [[1]]]
    assert not saturation(3, 1, [], records, images).proved
    records = [*records, record(11, (2,))]
    assert saturation(3, 1, [], records, [*images, [[1]]]).primes == (7, 11)
