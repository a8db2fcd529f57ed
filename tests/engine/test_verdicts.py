"""Verdicts: recognition of rational points, sole or not, complete lists, existence."""

from __future__ import annotations

import pytest

from sieve.curves.divisors import Divisor, Point
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.engine.investigation import Investigation
from sieve.engine.problem import Problem
from sieve.engine.verdicts import (
    CandidateList,
    Decision,
    decide_candidates,
    match_rational,
    surviving_classes,
)
from sieve.errors import Inconsistent
from sieve.exact.padic_number import PadicNumber
from sieve.local.chabauty import ChabautyPlace, LocatedCandidate
from tests.support.problems import investigate

CURVE = HyperellipticCurve([1, -2, 1, 2, 2, 4, 1])
BASE = Divisor.of([(1, CURVE.place_of_point((1, 1, 0)))])
KNOWN: tuple[Point, ...] = ((1, 1, 0), (0, 1, 1), (0, -1, 1), (1, 3, 1), (-1, 1, 1))
GENERATORS = (CURVE.difference((0, 1, 1), BASE), CURVE.difference((0, -1, 1), BASE))
P = 11


@pytest.fixture(scope="module")
def found() -> Investigation:
    return investigate(Problem("sextic", CURVE, BASE, GENERATORS, (), KNOWN, 2, "a test"), 160)


@pytest.fixture(scope="module")
def place() -> ChabautyPlace:
    place = ChabautyPlace(CURVE, P, 6)
    place.attach(BASE, GENERATORS)
    return place


def given(
    place: ChabautyPlace,
    point: Point,
    name: str,
    digits: int = 6,
    multiplicity: int = 1,
    at_most: int | None = None,
) -> LocatedCandidate:
    x, y, z = (PadicNumber.padic(P, c, 0, digits) for c in point)
    disc, t, n = place.integrals.parameter_of_padic(x, y, z)
    return LocatedCandidate(name, "point", disc, t, n, (x, y, z), multiplicity=multiplicity, at_most=at_most)


def decide(
    found: Investigation, place: ChabautyPlace, candidates: list[LocatedCandidate], complete: bool = False
) -> dict[str, Decision]:
    lists = [CandidateList(place, candidates, complete, "a test", "the list")]
    matched = match_rational(found, lists)
    decisions = decide_candidates(found, lists, matched, found.allowed_ells([P]), 160)
    assert set(decisions) == {(0, c.id) for c in candidates}
    return {name: decision for (_, name), decision in decisions.items()}


def test_known_and_unknown_rational_points(found: Investigation, place: ChabautyPlace) -> None:
    """A point that the case does not list is recognised by rational reconstruction.

    The list claims nothing, so that a point is alone near a candidate only by a bound of its own.
    """
    bounded = given(place, (0, 1, 1), "a", at_most=1)
    decisions = decide(
        found, place, [bounded, given(place, (1, 7, 2), "b"), given(place, (1, -1, 0), "c")]
    )
    assert [d.verdict for d in decisions.values()] == ["rational"] * 3
    assert decisions["a"].points == ((0, 1, 1),) and decisions["a"].given and decisions["a"].sole
    assert decisions["b"].points == ((1, 7, 2),) and not decisions["b"].given and not decisions["b"].sole
    assert "bounds" in decisions["b"].reason
    assert decisions["c"].points == ((1, -1, 0),) and not decisions["c"].given


def test_a_near_miss_is_not_rational(found: Investigation, place: ChabautyPlace) -> None:
    """A point in the disc of a known one that differs from it in a known digit."""
    start = given(place, (0, 1, 1), "it")

    def moved(k: int) -> LocatedCandidate:
        return LocatedCandidate(f"near {k}", "point", start.disc, (start.parameter + P**k) % P**6, 6)

    decisions = decide(found, place, [start, moved(1), moved(5)])
    assert decisions["it"].verdict == "rational"
    near, nearest = decisions["near 1"], decisions["near 5"]
    assert near.verdict == "eliminated" and near.primes and near.reason
    assert near.fate is not None and near.fate.eliminated
    # no group J(F_v) here has an element of order 11^5
    assert nearest.verdict == "open" and "same class as" in nearest.reason and "it" in nearest.reason
    assert nearest.fate is not None and nearest.fate.kind == "shared" and nearest.fate.same_as == ("it",)


def test_sole_or_not(found: Investigation, place: ChabautyPlace) -> None:
    disc = place.integrals.disc_of((0, 1, 1))
    decisions = decide(
        found,
        place,
        [
            given(place, (0, 1, 1), "double", multiplicity=2),
            given(place, (0, 1, 1), "double, one point", multiplicity=2, at_most=1),
            LocatedCandidate("disc", "disc", disc),
            LocatedCandidate("disc, one point", "disc", disc, at_most=1),
        ],
    )
    assert all(d.verdict == "rational" for d in decisions.values())
    assert {name: d.sole for name, d in decisions.items()} == {
        "double": False, "double, one point": True, "disc": False, "disc, one point": True,
    }  # fmt: skip
    assert "multiplicity 2" in decisions["double"].reason and "at_most" in decisions["disc"].reason


def test_complete_lists(found: Investigation, place: ChabautyPlace) -> None:
    everything = [given(place, point, str(point)) for point in KNOWN]
    assert len(decide(found, place, everything, complete=True)) == len(KNOWN)
    for missing in range(len(KNOWN)):
        rest = everything[:missing] + everything[missing + 1 :]
        with pytest.raises(Inconsistent, match="claims to be complete") as caught:
            decide(found, place, rest, complete=True)
        assert caught.value.witness == CURVE.format_point(KNOWN[missing]) and caught.value.file == "the list"
        decide(found, place, rest, complete=False)


def test_no_candidate_is_left_without_a_verdict(found: Investigation, place: ChabautyPlace) -> None:
    discs = len(place.group.point_logs)
    candidates = [LocatedCandidate(f"d{i}", "disc", i) for i in range(discs)]
    candidates += [LocatedCandidate(f"p{i}", "point", i, P * (i * i + 1), 2 + i % 5) for i in range(discs)]
    decisions = decide(found, place, candidates)
    for decision in decisions.values():
        assert decision.verdict in ("eliminated", "rational", "open")
        if decision.verdict == "open":
            assert decision.reason and decision.hint
        if decision.verdict == "eliminated":
            assert decision.reason and all(p < 160 for p in decision.primes)
    verdicts = [d.verdict for d in decisions.values()]
    assert verdicts.count("eliminated") >= discs // 2


def test_nothing_is_used_without_saturation(found: Investigation, place: ChabautyPlace) -> None:
    """With no l allowed, nothing is eliminated."""
    listing = [
        CandidateList(place, [LocatedCandidate("z", "point", 1, 3 * P, 6)], False, "a test", "the list")
    ]
    allowed = decide_candidates(found, listing, {}, found.allowed_ells([P]), 160)
    assert allowed[0, "z"].verdict == "eliminated"
    nothing = decide_candidates(found, listing, {}, [], 160)
    assert nothing[0, "z"].verdict == "open"
    # nor with no auxiliary prime, unless the class is outside the image of the group
    alone = decide_candidates(found, listing, {}, found.allowed_ells([P]), 2)
    assert alone[0, "z"].verdict == "open" or alone[0, "z"].primes == ()


def test_surviving_classes(found: Investigation) -> None:
    outlook = surviving_classes(found, found.allowed_ells(), 160)
    assert not outlook.empty and outlook.barrier is not None
    relation = outlook.outcome.relation
    assert relation.index > 1
    vectors = {tuple(s.vector) for s in outlook.vectors}
    assert {(0, 0), (1, 0), (0, 1), (1, 3)} <= vectors and len(vectors) == relation.count
    # (1, -1, 0) is a rational point that the case does not list: a class without explanation
    assert relation.contains((1, 1))
