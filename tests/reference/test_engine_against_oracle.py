"""The groups of the engine against textbook arithmetic, on every reference curve and small good prime."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

import pytest
from flint import fmpz_mat

from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.errors import Uncertified
from sieve.local.picard import PicardGroup, picard_group
from tests.support.pohlig_hellman import GroupOracle
from tests.support.reference_cases import ReferenceCase, primes, reference_cases
from tests.support.sweep import full_sweep


def relations(logs: Sequence[Sequence[int]], moduli: Sequence[int]) -> list[list[int]]:
    """The Hermite basis of the integer relations between elements of a product of cyclic groups."""
    k, width = len(logs), len(moduli)
    rows = [[*row, *(int(i == j) for j in range(k))] for i, row in enumerate(logs)]
    rows += [[m if i == j else 0 for j in range(width)] + [0] * k for i, m in enumerate(moduli)]
    hermite = [[int(c) for c in row] for row in fmpz_mat(rows).hnf().table()]
    return [row[width:] for row in hermite if not any(row[:width])][:k]


def compare(group: PicardGroup, oracle: GroupOracle) -> None:
    """Same structure, and the same relations between the points."""
    assert list(group.invariants) == oracle.invariants()
    points = oracle.J.points
    assert len(group.point_logs) == len(points)
    origin = group.point_logs[group.curve.index_of(*oracle.J.origin)]
    ours = [[int(c) for c in group.point_logs[group.curve.index_of(*p)] - origin] for p in points]
    theirs = [oracle.logarithm(oracle.J.of_point(p)) for p in points]
    width = 5
    cuts = [*range(0, len(points), width - 1), len(points)]
    for start, _ in pairwise(cuts):
        piece = slice(start, start + width)
        assert relations(ours[piece], group.invariants) == relations(theirs[piece], oracle.moduli)


@pytest.mark.slow
@pytest.mark.parametrize("case", reference_cases(), ids=lambda c: c.id)
def test_every_small_prime(case: ReferenceCase) -> None:
    curve = HyperellipticCurve(case.f, case.h)
    compared = 0
    for v in primes(60 if full_sweep() else 24):
        if not curve.is_smooth(v):
            continue
        try:
            group = picard_group(curve.modulo(v))
        except Uncertified:
            # allowed below 11 only
            assert v < 11
            continue
        compare(group, case.oracle(v))
        compared += 1
    assert compared >= 4
