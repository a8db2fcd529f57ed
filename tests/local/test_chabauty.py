"""Conditions from candidates: a homomorphism, the classes of the candidates, honest digits."""

from __future__ import annotations

import random
from itertools import pairwise

import pytest

from sieve.curves.divisors import Divisor
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.exact.padic_number import PadicNumber
from sieve.local.chabauty import ChabautyPlace, LocatedCandidate, useful_digits
from sieve.local.condition import Condition
from tests.support.planted import plant, spurious

CURVE = HyperellipticCurve([1, -2, 1, 2, 2, 4, 1])
BASE = Divisor.of([(1, CURVE.place_of_point((1, 1, 0)))])
GENERATORS = [CURVE.difference(p, BASE) for p in ((0, 1, 1), (0, -1, 1))]
# coordinates in these generators; tried before this program was written, at p = 3 .. 19
COORDINATES = {
    (1, 1, 0): (0, 0), (1, -1, 0): (1, 1), (0, 1, 1): (1, 0), (0, -1, 1): (0, 1),
    (1, 3, 1): (1, 3), (1, -3, 1): (0, -2), (-1, 1, 1): (-1, 3), (1, 7, 2): (-3, 2),
}  # fmt: skip


def sextic_place(p: int, digits: int = 6) -> ChabautyPlace:
    place = ChabautyPlace(CURVE, p, digits)
    place.attach(BASE, GENERATORS)
    return place


def point_candidate(
    place: ChabautyPlace, point: tuple[int, int, int], digits: int, name: str
) -> LocatedCandidate:
    t, known = place.integrals.parameter_of_point(point, digits)
    return LocatedCandidate(name, "point", place.integrals.disc_of(point), t, known)


def image(condition: Condition, vector: tuple[int, ...]) -> tuple[int, ...]:
    return tuple(
        sum(a * row[j] for a, row in zip(vector, condition.images, strict=True)) % m
        for j, m in enumerate(condition.moduli)
    )


def classes(condition: Condition) -> dict[str, tuple[int, ...]]:
    assert condition.labels is not None
    rows = [tuple(row) for row in condition.allowed.tolist()]
    return {name: row for row, names in zip(rows, condition.labels, strict=True) for name in names}


@pytest.mark.parametrize("p", [3, 5, 7, 11, 13, 17, 19])
def test_points_get_the_images_of_their_coordinates(p: int) -> None:
    place = sextic_place(p)
    candidates = [point_candidate(place, point, 6, str(point)) for point in COORDINATES]
    (condition,) = place.conditions(candidates, 2, (), True)
    assert condition.complete and condition.prime == p and condition.name == f"p = {p}"
    found = classes(condition)
    for point, vector in COORDINATES.items():
        assert found[str(point)] == image(condition, vector)
        coefficients = place.coefficients_of_point(point, 2)
        assert coefficients is not None
        assert all(c.agrees(a) and c.precision >= 3 for c, a in zip(coefficients, vector, strict=True))
    assert len(set(found.values())) == len(COORDINATES)
    assert condition.moduli[: len(place.group.invariants)] == place.group.invariants
    assert all(m % p == 0 for m in condition.moduli[len(place.group.invariants) :])


@pytest.mark.parametrize("p", [3, 7, 11])
def test_fewer_digits_are_a_coarser_condition(p: int) -> None:
    """Points that agree to n digits have one class when n digits are given."""
    place = sextic_place(p, 8)
    rng = random.Random(p)
    for _ in range(10):
        disc, t = rng.randrange(len(place.group.point_logs)), p * rng.randrange(p**7)
        rows = []
        for n in (8, 5, 3, 1):
            one = LocatedCandidate("z", "point", disc, t % p**n, n)
            other = LocatedCandidate("w", "point", disc, (t + p**n * rng.randrange(p**3)) % p**8, n)
            (condition,) = place.conditions([one, other], 2, (), False)
            found = classes(condition)
            assert found["z"] == found["w"]
            rows.append((condition, found["z"]))
        for (fine, a), (coarse, b) in pairwise(rows):
            assert all(m % n == 0 for m, n in zip(fine.moduli, coarse.moduli, strict=False))
            # abelian integrals may all be multiples of p^shift: compare where the scale is the same
            width = len(place.group.invariants)
            assert a[:width] == b[:width]


def test_a_disc_is_a_point_to_one_digit() -> None:
    place = sextic_place(7)
    disc = LocatedCandidate("disc", "disc", 2)
    points = [LocatedCandidate(f"p{t}", "point", 2, 7 * t, 1) for t in range(3)]
    (condition,) = place.conditions([disc, *points], 2, (), False)
    assert condition.count == 1 and condition.labels == (("disc", "p0", "p1", "p2"),)


def test_candidates_of_several_kinds_make_several_conditions() -> None:
    place = sextic_place(7)

    def number(value: int, digits: int) -> PadicNumber:
        return PadicNumber.padic(7, value, 0, digits)

    candidates = [
        LocatedCandidate("a", "point", 0, 7, 4),
        LocatedCandidate("b", "point", 1, 14, 4),
        LocatedCandidate("c", "point", 0, 7, 2),
        LocatedCandidate("d", "coefficients", None, coefficients=(number(5, 3), number(50, 2))),
        LocatedCandidate("e", "coefficients", 1, coefficients=(number(5, 3), number(1, 2))),
    ]
    conditions = place.conditions(candidates, 2, (), True)
    assert sorted(tuple(sorted(classes(c))) for c in conditions) == [("a", "b"), ("c",), ("d",), ("e",)]
    assert len({c.name for c in conditions}) == 4
    # no part of a complete list is complete
    assert not any(c.complete for c in conditions)
    by_label = {name: c for c in conditions for name in classes(c)}
    assert by_label["d"].moduli == (343, 49) and classes(by_label["d"])["d"] == (5, 1)
    assert by_label["d"].images == ((1, 0), (0, 1))
    assert by_label["e"].moduli == (343, 49, *place.group.invariants)
    assert classes(by_label["e"])["e"][2:] == place.class_of_disc(1)


def test_torsion_coefficients() -> None:
    """y^2 = x^5 + 1 has a torsion class of order 10 and rank 0."""
    curve = HyperellipticCurve([1, 0, 0, 0, 0, 1])
    base = Divisor.of([(1, curve.place_of_point((1, 0, 0)))])
    generator = curve.difference((0, 1, 1), base) + curve.difference((-1, 0, 1), base)
    place = ChabautyPlace(curve, 3, 4)
    place.attach(base, [generator])
    with_torsion = LocatedCandidate("t", "coefficients", None, torsion=(13,))
    (condition,) = place.conditions([with_torsion], 0, (10,), False)
    assert condition.moduli == (10,) and condition.images == ((1,),) and classes(condition) == {"t": (3,)}
    assert place.coefficients_of_point((0, 1, 1), 0) == []
    # abelian integrals of torsion classes vanish
    assert not any(place.logs[0].numerators)


@pytest.mark.parametrize("seed", range(6))
def test_dependent_logarithms_have_no_coefficients(seed: int) -> None:
    planted = plant(random.Random(f"chabauty {seed}"), 2)
    for p in (3, 5, 7):
        if not planted.curve.is_smooth(p):
            continue
        place = ChabautyPlace(planted.curve, p, 5)
        place.attach(planted.base, planted.group.generators)
        for point in planted.points:
            found = place.coefficients_of_point(point, planted.rank)
            if planted.rank > 2:
                assert found is None
            elif found is not None:
                expected = planted.coordinates[point].free
                assert all(c.agrees(a) for c, a in zip(found, expected, strict=True))


def test_precision_is_limited_to_what_is_useful() -> None:
    for p in (2, 3, 5, 7, 101, 10007):
        assert p ** useful_digits(p) < 2**30 <= p ** (useful_digits(p) + 1)
    place = ChabautyPlace(CURVE, 3, 60)
    place.attach(BASE, GENERATORS)
    (condition,) = place.conditions([point_candidate(place, (0, 1, 1), 18, "z")], 2, (), False)
    assert max(condition.moduli) < 2**30
    assert classes(condition)["z"] == image(condition, (1, 0))


def test_random_candidates_are_on_the_curve() -> None:
    """The helper that other tests draw from: discs and parameters of points of the curve."""
    place = sextic_place(5)
    for one in spurious(random.Random(1), place, 20):
        assert one.disc is not None
        x, y, z = place.integrals.point_at(one.disc, one.parameter, 6)
        value = y * y - sum(c * x**i * z ** (6 - i) for i, c in enumerate(CURVE.f))
        assert value % 5**6 == 0
