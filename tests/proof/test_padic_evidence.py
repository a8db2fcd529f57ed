"""The `padic` record on both models: the checker, which shares no code, finds the same logarithms from it."""

from __future__ import annotations

import io
import json
import random
from collections.abc import Sequence
from fractions import Fraction
from typing import Any

import flint
import pytest

from sieve.curves.divisors import Divisor, Place, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.protocol import Curve
from sieve.errors import BadReduction, Uncertified
from sieve.exact.padic_linear import PadicVector
from sieve.local.logarithms import PadicIntegrals
from sieve.local.picard import picard_group
from sieve.proof import checker
from sieve.proof.witness_padic import Inexpressible, PadicEvidence
from sieve.proof.writer import _divisor
from tests.support.quartics import quartics, random_line

DIGITS = 6


def log_of(
    curve: Curve, base: Divisor, free: Sequence[Divisor], padic: dict[str, Any]
) -> bytes:
    """A log that claims nothing but the logarithms."""
    records: list[dict[str, Any]] = [
        {
            "kind": "header", "format": "sieve-proof/1", "program": "tests",
            "case": {"name": "tests", "sha256": "0" * 64}, "equation": [list(row) for row in curve.rows],
            "weight": curve.weight, "genus": curve.genus, "y_scale": "1", "variables": ["x", "y", "z"],
        },
        {
            "kind": "group", "rank": len(free), "base": _divisor(base),
            "free": [_divisor(d) for d in free], "torsion": [], "integral": False,
        },
        {"kind": "premise", "id": "rank", "statement": "assumed", "source": "tests"},
        padic,
    ]
    end = {"kind": "end", "records": 4, "eliminated": [], "conclusion": "none", "points": []}
    return b"".join(json.dumps(r, separators=(",", ":")).encode() + b"\n" for r in [*records, end])


def checked(curve: Curve, base: Divisor, free: Sequence[Divisor], padic: dict[str, Any]) -> checker.Proof:
    return checker.check(io.BytesIO(log_of(curve, base, free, padic)))


def compare(curve: Curve, p: int, base: Divisor, free: Sequence[Divisor]) -> None:
    """Every divisor has the same logarithm for the checker, to the digits that were asked for."""
    group = picard_group(curve.modulo(p))
    places = list(dict.fromkeys(q for d in [base, *free] for _, q in d.terms if q.degree > 1))
    evidence = PadicEvidence(curve, group, places)
    record = evidence.record(evidence.discs_of([base, *free]), DIGITS, False)
    padic = checked(curve, base, free, record).padics[p]
    integrals = PadicIntegrals(curve, p, DIGITS, group)
    for divisor, written in zip([base, *free], [padic.proof.base, *padic.proof.generators], strict=True):
        found = padic.log(written)
        log = PadicVector.of(p, found.numerators, found.shift, found.precision)
        assert log.precision >= DIGITS
        assert log.agrees(integrals.log_divisor(divisor))


def usable(curve: Curve, p: int, place: Place) -> bool:
    try:
        PadicEvidence(curve, picard_group(curve.modulo(p)), [place])
        PadicIntegrals(curve, p, 1).log_place(place)
    except (Inexpressible, Uncertified, BadReduction):
        return False
    return True


@pytest.mark.parametrize("name", ["level13_split", "X0p97", "X0p113", "X0p139", "fourth_powers_17"])
@pytest.mark.parametrize("p", [3, 5, 7, 11])
def test_plane_quartics(name: str, p: int) -> None:
    """Known points, and closed places that lines cut out."""
    curve, points = quartics()[name]
    try:
        picard_group(curve.modulo(p))
    except (BadReduction, Uncertified):
        pytest.skip("no good reduction, or no certified group")
    rng = random.Random(f"{name} {p}")
    base = Divisor.of([(1, RationalPlace(points[0]))])
    free = [curve.difference(point, base) for point in points[1:5]]
    while len(free) < 7:
        for _, place in random_line(curve, points, rng):
            if place.degree > 1 and usable(curve, p, place):
                free.append(Divisor.of([(1, place)]) - place.degree * base)
    compare(curve, p, base, free)


CURVES = [
    ([1, -4, 2, -2, 1, 2, 1], [], (0, -1, 1)),
    ([0, -1, 0, 4, -4, 1], [1], (0, 0, 1)),
    ([0, 60, -112, 65, -14, 1], [], (0, 0, 1)),
    ([4, 8, 1, 3, 7, -2, 2, 1], [], (0, 2, 1)),
]


@pytest.mark.parametrize(("f", "h", "start"), CURVES)
@pytest.mark.parametrize("p", [2, 3, 5, 7, 11])
def test_hyperelliptic_curves(f: list[int], h: list[int], start: tuple[int, int, int], p: int) -> None:
    """Points at infinity and branch points, and factors of norms of random sections."""
    curve = HyperellipticCurve(f, h)
    try:
        picard_group(curve.modulo(p))
    except (BadReduction, Uncertified):
        pytest.skip("no good reduction, or no certified group")
    rng = random.Random(p)
    base = Divisor.of([(1, RationalPlace(start))])
    free = [Divisor.of([(1, RationalPlace(curve.involution(start)))]) - base]
    fp, hp = flint.fmpz_poly(f), flint.fmpz_poly(h)
    for _ in range(4):
        c = flint.fmpz_poly([rng.randint(-5, 5) for _ in range(curve.genus + 2)])
        for factor, _ in (c * c + hp * c - fp).factor()[1]:
            place = curve.mumford([Fraction(int(a)) for a in factor.coeffs()], [int(a) for a in c.coeffs()])
            if place.degree > 1 and usable(curve, p, place):
                free.append(Divisor.of([(1, place)]) - place.degree * base)
    if curve.contains((1, 0, 0)):
        free.append(Divisor.of([(1, RationalPlace((1, 0, 0)))]) - base)
    compare(curve, p, base, free)


@pytest.mark.parametrize("p", [2, 3, 5, 7])
def test_every_disc_is_isolated(p: int) -> None:
    """All discs of a curve with ramified ones, those at infinity included."""
    curve = HyperellipticCurve([0, -1, 0, 4, -4, 1], [1])
    group = picard_group(curve.modulo(p))
    evidence = PadicEvidence(curve, group, [])
    record = evidence.record(range(group.curve.count), DIGITS, False)
    assert [entry[0] for entry in record["discs"]] == list(range(group.curve.count))
    base = Divisor.of([(1, RationalPlace((0, 0, 1)))])
    padic = checked(curve, base, [], record).padics[p]
    assert sorted(padic.logs) == list(range(group.curve.count))


def test_a_place_that_only_a_multiple_of_which_is_rational_is_refused() -> None:
    """Modulo 3 the points generate a subgroup that does not contain the place (u = x^2 + 2 x + 2)."""
    u, v, w = (flint.fmpz_poly(c) for c in ([2, 2, 1], [-1, 1, -2, 1, 1], [0, 2, 2, -1]))
    curve = HyperellipticCurve([int(c) for c in (w * w - u * v).coeffs()])
    place = curve.mumford([Fraction(2), Fraction(2), Fraction(1)], [0, 2, 2, -1])
    with pytest.raises(Inexpressible, match="multiple"):
        PadicEvidence(curve, picard_group(curve.modulo(3)), [place])


def test_a_place_without_integral_equations_is_refused() -> None:
    curve = HyperellipticCurve([1, -4, 2, -2, 1, 2, 1])
    place = curve.mumford([Fraction(-2), Fraction(1), Fraction(1)], [Fraction(5, 3), Fraction(-8, 3)])
    with pytest.raises(Inexpressible, match="not simple"):
        PadicEvidence(curve, picard_group(curve.modulo(3)), [place])
