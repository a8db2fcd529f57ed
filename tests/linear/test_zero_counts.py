"""Zero counts on balls: against the zeros themselves, known points, and lists with something left out."""

from __future__ import annotations

import random
from dataclasses import replace
from functools import cache

import pytest
from flint import fmpz_poly

from sieve.curves.divisors import Divisor, FibrePlace, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.errors import PrecisionLost
from sieve.local.chabauty import LocatedCandidate
from sieve.local.linear_chabauty import chabauty_zeros
from sieve.local.zero_counts import ZeroProof, count_zeros, uncovered, zero_proof
from tests.linear.test_linear_chabauty import (
    BIELLIPTIC,
    PAIRS,
    even_curve,
    known,
    proposal,
    reference_zeros,
)
from tests.support.reference_cases import reference_case


@cache
def setting(name: str) -> tuple[HyperellipticCurve, Divisor, tuple[Divisor, ...]]:
    """A reference curve with base and free generators."""
    case = reference_case(name)
    curve = HyperellipticCurve(case.f, case.h)
    base = Divisor.of([(1, RationalPlace(curve.normalise(*case.relation_points[0])))])
    if not case.rank:
        return curve, base, ()
    free = [row[0] for row in case.relation_coordinates]
    smallest = min((abs(c), i) for i, c in enumerate(free) if c)[1]
    point = RationalPlace(curve.normalise(*case.relation_points[smallest]))
    return curve, base, (Divisor.of([(1, point)]) - base,)


def proof_of(name: str, p: int, candidates: list[LocatedCandidate], **keys: bool) -> ZeroProof:
    curve, base, generators = setting(name)
    return zero_proof(curve, base, generators, p, candidates, **keys)


# ---- series ----------------------------------------------------------------------------------------------


def test_counts_are_those_of_polynomials_with_known_roots() -> None:
    """Products of linear factors with roots in Z_p and outside: the roots in every ball are counted."""
    rng = random.Random(5)
    for _ in range(60):
        p, precision = rng.choice([3, 5, 7]), 24
        inner = [rng.randrange(p**3) for _ in range(rng.randrange(4))]
        poly = fmpz_poly([rng.choice([1, 2, p, p * p])])
        for root in inner:
            poly *= fmpz_poly([-root, 1])
        for _ in range(rng.randrange(3)):
            poly *= fmpz_poly([rng.randrange(1, p), p * rng.randrange(1, 9)])  # the root is no integer
        digits = rng.randrange(3)
        value = rng.randrange(p**digits)
        expected = sum((root - value) % p**digits == 0 for root in inner)
        assert count_zeros([poly], p, precision, value, digits) == [expected]
        covered = [(root % p**3, 3) for root in inner[1:]]
        left = uncovered([poly], p, precision, covered, 3)
        hidden = [root for root in inner[:1] if (root, 3) not in covered]
        assert left == [(root, 3) for root in hidden]


def test_common_zeros_are_needed() -> None:
    """(s - 1)(s - 2) and (s - 1)(s - 3): the ball of 1 is left, the others are excluded by one of the two."""
    pair = [fmpz_poly([2, -3, 1]), fmpz_poly([3, -4, 1])]
    assert uncovered(pair, 5, 6, [], 3) == [(1, 3)]
    assert uncovered(pair[:1], 5, 6, [], 3) == [(1, 3), (2, 3)]
    assert uncovered([fmpz_poly([5**6])], 5, 6, [], 3) == [(0, 0)]


# ---- curves ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("name", "p"), PAIRS)
def test_computed_lists_are_proved_complete(name: str, p: int) -> None:
    """The zeros of `chabauty_zeros` are all; the bounds are at most the multiplicities."""
    zeros = reference_zeros(name, p, 10)
    candidates = zeros.candidates()
    proof = proof_of(name, p, candidates)
    assert proof.complete
    assert [b.id for b in proof.bounds] == [c.id for c in candidates]
    for bound, c in zip(proof.bounds, candidates, strict=True):
        assert bound.at_most is not None and bound.at_most <= c.multiplicity
    assert dict(proof.counts) == {d.disc: d.count for d in zeros.discs}


@pytest.mark.parametrize(("name", "p"), PAIRS)
def test_a_candidate_left_out_is_missed(name: str, p: int) -> None:
    """Without the candidate of a known point the proof fails, there and nowhere else."""
    zeros = reference_zeros(name, p, 10)
    candidates = zeros.candidates()
    point = known(reference_case(name))[-1]
    disc = zeros.integrals.disc_of(point)
    t, _ = zeros.integrals.parameter_of_point(point, 10)
    kept = [c for c in candidates if c.disc != disc or (t - c.parameter) % p**c.digits]
    assert len(kept) == len(candidates) - 1
    proof = proof_of(name, p, kept)
    assert any(d == disc and (t - value) % p**digits == 0 for d, value, digits in proof.missing)


def test_a_changed_digit_is_noticed() -> None:
    """A ball one digit off leaves the zero uncovered, and holds no zero itself."""
    candidates = reference_zeros("X0_37", 5, 10).candidates()
    wrong = replace(candidates[0], parameter=(candidates[0].parameter + 5**9) % 5**10)
    proof = proof_of("X0_37", 5, [wrong, *candidates[1:]])
    assert not proof.complete and proof.bound(wrong.id).at_most == 0


def test_whole_discs_are_complete_and_bounded() -> None:
    """Every disc as a candidate: complete without looking, bounds are the counts of the discs."""
    zeros = reference_zeros("quadratic_period_5", 7, 6)
    discs = [LocatedCandidate(f"d{d.disc}", "disc", d.disc) for d in zeros.discs]
    proof = proof_of("quadratic_period_5", 7, discs)
    assert proof.complete
    assert [b.at_most for b in proof.bounds] == [d.count for d in zeros.discs]
    affine = [d for d in discs if not zeros.integrals.discs[int(d.disc or 0)].at_infinity]
    assert len(affine) < len(discs)
    assert not proof_of("quadratic_period_5", 7, affine).complete
    assert proof_of("quadratic_period_5", 7, affine, integral=True).complete


def test_empty_discs_need_no_candidate() -> None:
    """Discs with no zero of some integral are proved empty."""
    zeros = reference_zeros("lmfdb2059", 11, 6)
    empty = {d.disc for d in zeros.discs if not d.balls}
    assert empty
    proof = proof_of("lmfdb2059", 11, [])
    assert not empty & {disc for disc, _, _ in proof.missing}
    assert {disc for disc, _, _ in proof.missing} == {d.disc for d in zeros.discs} - empty


@pytest.mark.parametrize("key", sorted(BIELLIPTIC))
def test_double_zeros_at_rational_points(key: tuple[int, int, int, int]) -> None:
    """An exactly annihilating x^j dx/y with a double zero of its integral at x = 0 or infinity."""
    curve, found, p = even_curve(key), proposal(even_curve(key), 1), 7
    if not curve.is_smooth(p):
        pytest.skip("bad reduction")
    zeros = chabauty_zeros(curve, found.base, found.generators, p, 8)
    candidates = zeros.candidates()
    proof = zero_proof(curve, found.base, found.generators, p, candidates)
    assert proof.complete
    for point in found.points:
        special = point[0] == 0 if BIELLIPTIC[key][0] == 0 else point[2] == 0
        disc = zeros.integrals.disc_of(point)
        here = [c for c in candidates if c.disc == disc and c.multiplicity == 2]
        if special:
            assert len(here) == 1 and proof.bound(here[0].id).central


def test_a_torsion_generator_proves_nothing() -> None:
    curve, base, _ = setting("X1_13")
    torsion = Divisor.of([(1, RationalPlace((0, 1, 1)))]) - base
    with pytest.raises(PrecisionLost):
        zero_proof(curve, base, [torsion], 5, [])


@pytest.mark.parametrize(("name", "p"), [("X0_37", 11), ("quadratic_period_5", 7)])
def test_a_base_of_degree_two(name: str, p: int) -> None:
    """Half a fibre in place of the base point: the same counts."""
    curve, base, generators = setting(name)
    candidates = reference_zeros(name, p, 6).candidates()
    half = Divisor.of([(1, FibrePlace(1))])
    once = zero_proof(curve, base, generators, p, candidates)
    twice = zero_proof(curve, half, generators, p, candidates)
    assert once.complete and twice.complete and once.counts == twice.counts
