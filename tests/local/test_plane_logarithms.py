"""Logarithms on plane quartics: integer coordinates, lines, other models, precision, p-adic points."""

from __future__ import annotations

import random
from fractions import Fraction
from functools import cache
from itertools import combinations

import flint
import pytest

from sieve.curves.algebras import fractions_of, rational_poly
from sieve.curves.discs import differentials
from sieve.curves.divisors import ClosedPlace, Divisor, Place, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.plane import PlaneCurve
from sieve.errors import BadReduction, PrecisionLost, Uncertified
from sieve.exact.padic_linear import PadicVector, combine
from sieve.exact.padic_number import PadicNumber
from sieve.exact.series import coefficients, polynomial
from sieve.local import closed_points
from sieve.local.chabauty import ChabautyPlace
from sieve.local.logarithms import PadicIntegrals
from sieve.local.picard import picard_group
from tests.support.quartics import quartics, random_line

PRIMES = (3, 5, 7, 11, 13, 17, 19)
DIGITS = 10
RANK_THREE = ["level13_split", "level13_S4", "X0p97", "X0p113", "X0p139", "X0p151", "X0p239"]


@cache
def integrals_of(name: str, p: int, digits: int = DIGITS) -> PadicIntegrals | None:
    curve = quartics()[name][0]
    if not curve.is_smooth(p):
        return None
    try:
        return PadicIntegrals(curve, p, digits, picard_group(curve.modulo(p)))
    except Uncertified:
        return None


def integer_coordinates(curve: PlaneCurve, points: list[tuple[int, int, int]], basis: list[int], p: int,
                        digits: int = DIGITS) -> list[tuple[Fraction, ...]] | None:
    """The coordinates of P - P0 in the three differences of the basis, as rationals of small height."""
    place = ChabautyPlace(curve, p, digits)
    origin = Divisor.of([(1, RationalPlace(points[0]))])
    place.attach(origin, [curve.difference(points[i], origin) for i in basis])
    out = []
    for point in points:
        found = place.coefficients_of_point(point, 3)
        if found is None:
            return None
        out.append(tuple(_rational(c) for c in found))
    return out


def _rational(number: PadicNumber) -> Fraction:
    """The fraction a/b with the smallest a and b that agrees (lattice reduction)."""
    if number.is_zero:
        return Fraction(0)
    shift = Fraction(number.prime) ** min(number.valuation, 0)
    digits = number.precision - min(number.valuation, 0)
    modulus = number.prime**digits
    residue = (number * (1 / shift)).residue(digits)
    rows = flint.fmpz_mat([[modulus, 0], [residue, 1]]).lll()
    return Fraction(int(rows[0, 0]), int(rows[0, 1])) * shift


@pytest.mark.parametrize("name", RANK_THREE)
def test_the_same_integers_at_every_prime(name: str) -> None:
    """Coordinates of all known points in three of their differences: one rational matrix for all p."""
    curve, points = quartics()[name]
    primes = [p for p in PRIMES if curve.is_smooth(p)]
    basis = None
    for choice in combinations(range(1, len(points)), 3):
        found = integer_coordinates(curve, list(points), list(choice), primes[1])
        if found is not None and all(c.denominator < 20 and abs(c) < 50 for row in found for c in row):
            basis, expected = list(choice), found
            break
    assert basis is not None
    assert any(any(row) for i, row in enumerate(expected) if i not in basis) or len(points) == 4
    for p in primes:
        assert integer_coordinates(curve, list(points), basis, p) == expected


def transformed(curve: PlaneCurve, points: list[tuple[int, int, int]], seed: int, primes: tuple[int, ...]):
    """The image under an integer matrix whose determinant no prime of the list divides."""
    rng = random.Random(seed)
    while True:
        matrix = flint.fmpz_mat([[rng.randint(-2, 2) for _ in range(3)] for _ in range(3)])
        if all(int(matrix.det()) % p for p in primes):
            break
    inverse = matrix.inv() * matrix.det()
    entries = [[int(inverse[i, j].p) for j in range(3)] for i in range(3)]
    ring = flint.fmpz_mpoly_ctx.get(["x", "y", "z"], "lex")
    gens = ring.gens()
    images = [sum((c * g for c, g in zip(row, gens, strict=True)), ring.constant(0)) for row in entries]
    total = ring.constant(0)
    for exponents, c in curve.terms.items():
        term = ring.constant(c)
        for base, exponent in zip(images, exponents, strict=True):
            term = term * base**exponent
        total += term
    other = PlaneCurve({tuple(int(e) for e in m): int(c) for m, c in total.to_dict().items()})
    moved = []
    for point in points:
        image = [sum(int(matrix[i, j]) * point[j] for j in range(3)) for i in range(3)]
        moved.append(other.normalise(*(Fraction(c) for c in image)))
    return other, moved


@pytest.mark.parametrize("seed", range(4))
def test_another_model_gives_the_same_integers(seed: int) -> None:
    curve, points = quartics()["X0p113"]
    other, moved = transformed(curve, list(points), seed, (3, 7))
    expected = integer_coordinates(curve, list(points), [1, 2, 3], 5)
    assert expected is not None
    for p in (3, 7):
        assert integer_coordinates(other, moved, [1, 2, 3], p) == expected


@pytest.mark.parametrize("name", sorted(quartics()))
@pytest.mark.parametrize("p", [3, 5, 7, 11])
def test_lines_have_logarithm_zero(name: str, p: int) -> None:
    """Their zeros reduce in many ways: inert, split, ramified, in the discs of all three charts."""
    integrals = integrals_of(name, p)
    if integrals is None:
        pytest.skip("no good reduction, or no certified group")
    (curve, points), rng, done = quartics()[name], random.Random(f"{name} {p}"), 0
    for _ in range(12):
        terms = random_line(curve, points or [(1, 0, 0)], rng)
        try:
            logs = [(Fraction(m), integrals.log_place(place)) for m, place in terms]
        except (BadReduction, Uncertified):
            continue
        total = combine(logs)
        assert total.is_zero and total.precision >= DIGITS
        done += 1
    assert done >= 4


def two_pairs(seed: int) -> tuple[PlaneCurve, int, list[Place]]:
    """A random quartic, a prime, and two places of degree 2 that make up its zeros on the line z = 0."""
    rng = random.Random(seed)
    p = rng.choice([2, 3, 3, 5, 5, 7])
    first, second = ([rng.randint(-4, 4), rng.randint(-4, 4), 1] for _ in range(2))
    terms: dict[tuple[int, int, int], int] = {}
    for i, a in enumerate(first):
        for j, b in enumerate(second):
            terms[4 - i - j, i + j, 0] = terms.get((4 - i - j, i + j, 0), 0) + a * b
    terms |= {(i, j, 4 - i - j): rng.randint(-2, 2) for i in range(4) for j in range(4 - i)}
    curve = PlaneCurve(terms)
    one, t = [Fraction(1)], [Fraction(0), Fraction(1)]
    return curve, p, [curve.closed_point([Fraction(a) for a in u], one, t, []) for u in (first, second)]


@pytest.mark.parametrize(
    ("seed", "p", "k"),
    [(4958, 2, 2), (565, 7, 2), (4475, 3, 3), (5994, 5, 4), (2414, 3, 5), (936, 3, 7), (465, 3, 9)],
)
def test_multiples_of_places_are_used(seed: int, p: int, k: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """The points modulo p generate too little: only k times a place is equivalent to points; p | k too."""
    used: set[int] = set()
    original = closed_points._multiple

    def noted(scheme, times, *rest):  # type: ignore[no-untyped-def]
        used.add(times)
        return original(scheme, times, *rest)

    monkeypatch.setattr(closed_points, "_multiple", noted)
    curve, prime, places = two_pairs(seed)
    assert prime == p
    integrals = PadicIntegrals(curve, p, DIGITS)
    first, second = (integrals.log_place(place) for place in places)
    assert (first + second).is_zero and min(first.precision, second.precision) >= DIGITS
    assert used == {k} and not first.is_zero


def test_places_may_be_written_in_many_ways() -> None:
    """t replaced by t / p and coordinates scaled by a function: the same points, with denominators at p."""
    integrals = integrals_of("X0p97", 7)
    assert integrals is not None
    (curve, points), rng, checked = quartics()["X0p97"], random.Random(4), 0
    for _ in range(12):
        for _, place in random_line(curve, points, rng):
            if not isinstance(place, ClosedPlace):
                continue
            try:
                expected = integrals.log_place(place)
            except BadReduction:
                continue
            parts = (place.u, place.x, place.y, place.z)
            u, *coordinates = ([c * Fraction(7) ** i for i, c in enumerate(part)] for part in parts)
            scaled = [fractions_of(rational_poly(c) * rational_poly([1, 2]) / 7) for c in coordinates]
            try:
                other = curve.closed_point(u, *scaled)
                assert integrals.log_place(other).agrees(expected)
                checked += 1
            except BadReduction:
                continue
    assert checked >= 5


def test_logarithms_of_line_sections_are_not_all_zero() -> None:
    integrals = integrals_of("X0p97", 7)
    assert integrals is not None
    points = quartics()["X0p97"][1]
    logs = [integrals.log_point(point) for point in points]
    assert sum(not log.is_zero for log in logs) > 5
    assert len({log.numerators for log in logs}) == len(points)


@pytest.mark.parametrize("name", ["X0p97", "level13_split", "fourth_powers_17"])
def test_few_digits_agree_with_many(name: str) -> None:
    points = quartics()[name][1]
    for p in (3, 5, 7):
        few, many = integrals_of(name, p, 2), integrals_of(name, p, 20)
        if few is None or many is None:
            continue
        for point in points:
            rough, exact = few.log_point(point), many.log_point(point)
            assert rough.precision >= 2 and exact.precision >= 20 and rough.agrees(exact)


@pytest.mark.parametrize("name", ["X0p97", "level13_split", "level13_S4"])
@pytest.mark.parametrize("p", [3, 5, 7])
def test_points_are_found_from_their_coordinates(name: str, p: int) -> None:
    """Random points of every disc in every chart, coordinates scaled by units and powers of p."""
    integrals = integrals_of(name, p)
    assert integrals is not None
    rng = random.Random(p)
    charts = set()
    for disc in range(integrals.group.curve.count):
        chart = integrals.discs[disc]
        charts.add(chart.chart)
        t = p * rng.randrange(p**5)
        point = integrals.point_at(disc, t, 6)
        assert tuple(c % p for c in point) == chart.point
        scale = Fraction(rng.choice([1, 2, p, Fraction(1, p * p)]))
        numbers = [PadicNumber.from_fraction(c, p, 6) * scale for c in point]
        found, parameter, digits = integrals.parameter_of_padic(*numbers)
        assert found == disc and 1 <= digits <= 6 and (parameter - t) % p**digits == 0
        assert integrals.log_parameter(disc, t, 6).agrees(integrals.log_parameter(disc, t, DIGITS))
    assert {"z", "x"} <= charts
    with pytest.raises(ValueError, match="not on the curve"):
        integrals.parameter_of_padic(*(PadicNumber.from_fraction(c, p, 6) for c in (1, 1, p)))
    with pytest.raises(PrecisionLost):
        integrals.parameter_of_padic(*(PadicNumber.from_fraction(0, p, 3) for _ in range(3)))


@pytest.mark.parametrize("name", ["X0p97", "level13_split"])
def test_rational_points_have_their_parameters(name: str) -> None:
    points = quartics()[name][1]
    for p in (3, 5, 7):
        integrals = integrals_of(name, p)
        assert integrals is not None
        for point in points:
            disc = integrals.disc_of(point)
            t, digits = integrals.parameter_of_point(point, 8)
            found = integrals.point_at(disc, t, 8)
            assert digits == 8
            modulus = p**8
            pairs = [(0, 1), (0, 2), (1, 2)]
            assert all((point[i] * found[j] - point[j] * found[i]) % modulus == 0 for i, j in pairs)


def test_differentials_of_the_three_charts_are_the_same() -> None:
    """x^i y^k dx / F_y in the charts X = 1 and Y = 1, from x = X/Z, y = Y/Z and homogeneous derivatives."""
    curve, _ = quartics()["X0p113"]
    p, exponent, length = 11, 6, 12
    for order in ((0, 1, 2), (1, 0, 2), (2, 1, 0), (0, 2, 1), (1, 2, 0), (2, 0, 1)):
        swapped = PlaneCurve({tuple(e[i] for i in order): c for e, c in curve.terms.items()})
        integrals = PadicIntegrals(swapped, p, 4)
        for disc in integrals.discs:
            if disc.chart == "z":
                continue
            series = disc.expansion(exponent, length)
            modulus = p**exponent
            one = polynomial([1], modulus)
            x, y, z = {"x": (one, series.b, series.a), "y": (series.a, one, series.b)}[disc.chart]
            # F_y(x, y, 1) = F_Y(X, Y, Z) / Z^3 and d(X/Z) = (Z dX - X dZ) / Z^2
            fy = polynomial([], modulus)
            for (i, j, k), c in swapped.terms.items():
                if j:
                    fy += c * j * x**i * y ** (j - 1) * z**k
            change = z * x.derivative() - x * z.derivative()
            for (i, k), form in zip(differentials(1, 4), series.forms, strict=True):
                left = (form * fy).truncate(length - 1)
                right = (x**i * y**k * z ** (1 - i - k) * change).truncate(length - 1)
                assert coefficients(left, length - 1) == coefficients(right, length - 1)


# ---- a hyperelliptic curve of genus 3 ---------------------------------------------------------------------


GENUS_THREE = [
    (3, (-2, 12, 1), (1077, 3336, 978)),
    (3, (0, 2, 1), (621, 2340, 3234)),
    (5, (-1, 2, 1), (125985, 329780, 82375)),
    (7, (-2, 12, 1), (4384891, 3142363, 2847628)),
    (11, (-1, 2, 1), (56315743, 57103398, 102712753)),
]


def test_hyperelliptic_values_stay() -> None:
    """Half the integrals from the conjugate of P to P, by the algorithm for hyperelliptic curves alone."""
    curve = HyperellipticCurve([4, 8, 1, 3, 7, -2, 2, 1])
    for p, point, numerators in GENUS_THREE:
        assert PadicIntegrals(curve, p, 8).log_point(point).agrees(PadicVector.of(p, numerators, 0, 8))
