"""What an investigation finds out about a case, and what it refuses."""

from __future__ import annotations

from collections.abc import Sequence

import pytest

from sieve.curves.divisors import Divisor, Point
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.engine.investigation import Investigation
from sieve.engine.problem import Problem
from sieve.errors import Inconsistent
from sieve.exact.primes import primes_below
from sieve.local.records import LocalRecord
from tests.support.problems import investigate, known_point_problem
from tests.support.reference_cases import reference_case

CURVE = HyperellipticCurve([1, -2, 1, 2, 2, 4, 1])
BASE = Divisor.of([(1, CURVE.place_of_point((1, 1, 0)))])
POINTS: tuple[Point, ...] = ((0, 1, 1), (0, -1, 1), (1, 3, 1), (-1, 1, 1), (-1, -1, 1), (1, 7, 2))


def difference(point: Point) -> Divisor:
    return CURVE.difference(point, BASE)


def problem(
    generators: Sequence[Divisor],
    known: Sequence[Point] = (),
    rank: int | None = None,
    torsion: Sequence[tuple[int, Divisor]] = (),
    index_prime_to: tuple[int, ...] = (),
) -> Problem:
    count = len(generators) if rank is None else rank
    return Problem(
        "sextic",
        CURVE,
        BASE,
        tuple(generators),
        tuple(torsion),
        tuple(known),
        count,
        "a test",
        index_prime_to,
        "?",
    )


GOOD = [difference((0, 1, 1)), difference((0, -1, 1))]


def test_coordinates_and_index() -> None:
    found = investigate(problem(GOOD, POINTS))
    assert found.coordinates[1, 3, 1].vector == (1, 3) and found.coordinates[-1, 1, 1].vector == (-1, 3)
    assert found.saturation_at(3).proved and not found.saturation_at(2).proved
    # the two points over x = -1 generate a subgroup of index 4 in that of all known points (tried before)
    small = investigate(problem([difference((-1, 1, 1)), difference((-1, -1, 1))], POINTS))
    denominators = {c.denominator for c in small.coordinates.values()}
    assert denominators == {1, 4} or denominators == {1, 2, 4}
    at_two = small.saturation_at(2)
    assert not at_two.proved and "divides the index" in at_two.reason
    assert 2 not in small.allowed_ells() and 3 in small.allowed_ells()
    trusted = investigate(problem([difference((-1, 1, 1)), difference((-1, -1, 1))], (), index_prime_to=(2,)))
    assert 2 in trusted.allowed_ells()


@pytest.mark.parametrize("factor", [2, 3, 5, 7])
def test_multiples_are_found_out(factor: int) -> None:
    """Without any known point: the multiple is named as the combination that looks divisible."""
    found = investigate(problem([factor * GOOD[0], GOOD[1]]), 250)
    saturation = found.saturation_at(factor)
    assert not saturation.proved and factor not in found.allowed_ells()
    if factor != 2:
        assert saturation.combination is not None
        assert saturation.combination[0] % factor and saturation.combination[1] % factor == 0


def refused(case: Problem, message: str) -> None:
    with pytest.raises(Inconsistent, match=message):
        investigate(case)


def test_contradictions() -> None:
    refused(problem([GOOD[0], 3 * GOOD[0]]), "dependent")
    refused(problem([*GOOD, GOOD[0] - GOOD[1]]), "dependent")
    refused(problem(GOOD[:1], POINTS), r"known point \(0 : -1 : 1\): no combination of small height")
    refused(problem([], POINTS), "known point")
    refused(problem(GOOD[:1], torsion=[(5, GOOD[1])]), "torsion generator no. 1: not of order 5")
    wrong_base = Problem(
        "x", CURVE, Divisor.of([(1, CURVE.place_of_point((0, 1, 1)))]), (GOOD[0],), (), POINTS, 1, ""
    )
    refused(wrong_base, "known point")


def quintic(
    torsion: Sequence[tuple[int, Divisor]], known: Sequence[Point], from_points: bool = False
) -> Problem:
    """y^2 = x^5 + 1: J(Q) is cyclic of order 10 and X(Q) has the points at 0, -1 and infinity (folklore)."""
    curve = HyperellipticCurve([1, 0, 0, 0, 0, 1])
    base = Divisor.of([(1, curve.place_of_point((1, 0, 0)))])
    return Problem("quintic", curve, base, (), tuple(torsion), tuple(known), 0, "a test", (), "", from_points)


def test_torsion_claims() -> None:
    known = ((1, 0, 0), (0, 1, 1), (0, -1, 1), (-1, 0, 1))
    curve = quintic((), ()).curve
    base = quintic((), ()).base
    five, two = curve.difference((0, 1, 1), base), curve.difference((-1, 0, 1), base)
    right = investigate(quintic([(5, five), (2, two)], known))
    assert right.torsion_proved() and right.saturation_at(2).proved and right.saturation_at(5).proved
    assert right.coordinates[0, -1, 1].torsion == (4, 0)
    whole = investigate(quintic([(10, five + two)], known))
    assert whole.torsion_proved() and whole.coordinates[-1, 0, 1].torsion == (5,)
    found = investigate(quintic([], known, from_points=True))
    assert found.orders == (10,) and found.torsion_proved()
    # a known point proves that the claim is too small
    refused(
        quintic([(5, five)], known), r"torsion: the known point \(-1 : 0 : 1\) gives a torsion class outside"
    )
    # without known points nothing is refuted, but nothing is used at 2 either
    quiet = investigate(quintic([(5, five)], ()))
    assert not quiet.torsion_proved() and not quiet.saturation_at(2).proved and quiet.saturation_at(5).proved
    refused(quintic([(2, two), (2, two)], ()), "a group of order 2")
    for claimed in (2, 20, 15):
        refused(quintic([(claimed, five + two)], ()), "torsion")
        refused(quintic([(claimed, five + two)], known, from_points=True), "of order 10")


def test_a_basis_from_the_known_points_needs_the_right_rank() -> None:
    for rank in (0, 1, 3):
        case = Problem("x", CURVE, BASE, (), (), POINTS, rank, "", from_known_points=True)
        refused(case, "generate a group of rank 2")


def test_the_order_of_gathering_does_not_matter() -> None:
    case = known_point_problem(reference_case("bielliptic_137"))
    first, second = Investigation(case), Investigation(case)
    first.gather(primes_below(110))
    first.establish(lambda primes: None)
    saved: list[LocalRecord] = []
    second.gather(reversed(primes_below(60)), saved.append)
    second.gather(primes_below(110), saved.append)
    second.establish(lambda primes: None)
    assert [r.prime for r in saved] == list(primes_below(110))
    assert first.rows == second.rows and first.coordinates == second.coordinates
    assert [r.prime for r in first.usable] == [r.prime for r in second.usable]
    assert {r.prime for r in first.usable} | {r.prime for r in first.skipped} == set(primes_below(110))
    assert all(r.skipped for r in first.skipped)
    ells = first.allowed_ells()
    assert [r.count for r in first.relations(ells, 60)] == [r.count for r in second.relations(ells, 60)]
    assert len(first.relations(ells, 60)) < len(first.relations(ells))
    assert [r.name for r in first.relations(ells, None, {11, 59})] == ["v = 11", "v = 59"]


def test_images_are_those_of_the_generators_in_use() -> None:
    """Divisors of the basis have the images that were combined from those of the points."""
    case = known_point_problem(reference_case("lmfdb2059"))
    found = investigate(case)
    direct = Investigation(
        Problem("x", case.curve, case.base, tuple(found.generators), (), (), len(found.generators), "")
    )
    direct.gather(list(primes_below(60)))
    for record in direct.usable:
        assert record.images == found.images(found.records[record.prime])
