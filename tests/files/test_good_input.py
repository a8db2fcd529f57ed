"""Correct files in every form the notation allows, and p-adic points that are or are not on the curve."""

from __future__ import annotations

import hashlib
import json
import random
from fractions import Fraction
from pathlib import Path

import pytest

from sieve.curves.divisors import MumfordPlace, RationalPlace
from sieve.curves.hyperelliptic import HyperellipticCurve
from sieve.curves.notation import Origin, parse_equation
from sieve.errors import InputError
from sieve.exact.padic_number import PadicNumber
from sieve.files.candidates import (
    Candidate,
    check_candidates,
    check_on_curve,
    disc_residues,
    load_candidates,
    model_coordinates,
)
from sieve.files.case import load_case
from sieve.files.resolve import hyperelliptic_curve, read_case

HERE = Origin("case.toml", "curve.equation")
SEXTIC = "y^2 = x^6 + 4*x^5 + 2*x^4 + 2*x^3 + x^2 - 2*x + 1"

CASE = """
format = "sieve-case/1"
name = "{name}"
known_points = [{points}]
[curve]
equation = "{equation}"
[jacobian]
rank = {rank}
rank_source = "invented"
base = {base}
{rest}
"""


def write_case(folder: Path, **changes: str) -> Path:
    fields = {"name": "test", "points": "", "equation": SEXTIC, "rank": "0", "rest": ""}
    fields["base"] = '"(1 : 1 : 0)"'
    path = folder / "case.toml"
    path.write_text(CASE.format(**(fields | changes)), "utf-8")
    return path


def curve_of(equation: str) -> HyperellipticCurve:
    return hyperelliptic_curve(parse_equation(equation, ["x", "y", "z"], HERE), HERE)


def test_the_example_of_the_interface(tmp_path: Path) -> None:
    rest = """
index_prime_to = [5, 3]
index_source = "invented"
[[jacobian.generators]]
divisor = [[1, "(0 : -1 : 1)"], [-1, "(1 : 1 : 0)"]]
[[jacobian.generators]]
divisor = [[1, "(-1, 1)"], [-1, "(1 : 1 : 0)"]]
[[jacobian.torsion]]
order = 3
divisor = [[1, "(0 : 1 : 1)"], [-1, "(1 : 1 : 0)"]]
"""
    points = '"(0 : 1 : 1)", "(0, -1)", "(0 : 8 : 2)", "(1 : 1 : 0)"'
    path = write_case(tmp_path, rank="2", rest=rest, points=points)
    case = load_case(path)
    assert (case.name, case.rank, case.rank_source, case.path) == ("test", 2, "invented", str(path))
    assert case.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert case.index_prime_to == (3, 5) and case.generators_from is None
    problem = read_case(path)
    assert problem.curve.f == (1, -2, 1, 2, 2, 4, 1) and problem.curve.h == ()
    assert problem.known_points == ((0, 1, 1), (0, -1, 1), (1, 1, 0))
    assert problem.base_point == (1, 1, 0) and problem.base.degree == 1
    assert [d.degree for d in problem.generators] == [0, 0]
    assert problem.generators[1].terms[0] == (1, RationalPlace((-1, 1, 1)))
    ((order, divisor),) = problem.torsion
    assert order == 3 and divisor.degree == 0


def test_places_of_every_form(tmp_path: Path) -> None:
    # 4*y^2 = ..: the model has y' = 2*y, and places are in the coordinates of the model
    equation = "4*y^2 = x^6 + 4*x^5 + 2*x^4 + 2*x^3 + x^2 - 2*x + 1"
    rest = """
[[jacobian.generators]]
divisor = [[1, { mumford = ["2*x^2 + 2*x", "x + 1/2"] }], [-2, "(1 : 1/2 : 0)"]]
[[jacobian.generators]]
divisor = [[1, { root_of = "t^2 + t", point = "(t, t + 1/2)" }], [-2, "(1 : 1/2 : 0)"]]
[[jacobian.generators]]
divisor = [[1, { root_of = "t^2 + t", point = "(2*t : 8*t + 4 : 2)" }], [-2, "(1 : 1/2 : 0)"]]
"""
    base = '[[2, "(1 : 1/2 : 0)"], [-1, "(0, 1/2)"]]'
    problem = read_case(write_case(tmp_path, equation=equation, rank="3", rest=rest, base=base))
    assert problem.curve.y_scale == 2
    assert problem.base_point is None and problem.base.degree == 1
    expected = MumfordPlace((Fraction(0), Fraction(1), Fraction(1)), (Fraction(1), Fraction(2)))
    for generator in problem.generators:
        assert {place for _, place in generator.terms} == {expected, RationalPlace((1, 1, 0))}


def test_generators_from_known_points(tmp_path: Path) -> None:
    points = '"(0 : 1 : 1)", "(0 : -1 : 1)", "(1 : 1 : 0)"'
    path = write_case(tmp_path, rank="2", rest='generators_from = "known_points"', points=points)
    assert read_case(path).case.generators_from == "known_points"


@pytest.mark.parametrize(
    ("equation", "f", "h", "scale"),
    [
        ("y^2 = x^5 + 1", (1, 0, 0, 0, 0, 1), (), 1),
        ("x^5 + 1 - y^2 = 0", (1, 0, 0, 0, 0, 1), (), 1),
        ("0 = 2*y^2 - 2*x^5 - 2", (1, 0, 0, 0, 0, 1), (), 1),
        ("y^2 + (x^3 + 1)*y = x", (0, 1), (1, 0, 0, 1), 1),
        ("y*(y + x^3 + 1) = x", (0, 1), (1, 0, 0, 1), 1),
        ("4*y^2 = x^5 + 1", (1, 0, 0, 0, 0, 1), (), 2),
        ("2*y^2 = x^5 + 1", (2, 0, 0, 0, 0, 2), (), 2),
        ("-y^2 = x^5 + 1", (-1, 0, 0, 0, 0, -1), (), 1),
        ("y^2 = x^5/9 + 1", (9, 0, 0, 0, 0, 1), (), 3),
        ("y^2 + y/3 = x^5 + 1", (9, 0, 0, 0, 0, 9), (1,), 3),
    ],
)
def test_equations_in_any_arrangement(
    equation: str, f: tuple[int, ...], h: tuple[int, ...], scale: int
) -> None:
    curve = curve_of(equation)
    assert (curve.f, curve.h, curve.y_scale) == (f, h, scale)


def test_the_model_has_the_points_of_the_equation() -> None:
    polynomial = parse_equation("3*y^2 + (x^2/2 - 1)*y = x^5/5 + 7*x - 1/3", ["x", "y", "z"], HERE)
    curve = hyperelliptic_curve(polynomial, HERE)
    for x in range(-5, 6):
        for y in (Fraction(-3), Fraction(1, 2), Fraction(7, 3)):
            value = sum(c * x ** e[0] * y ** e[1] for e, c in polynomial.items())
            model_y = y * curve.y_scale
            h = sum(c * x**i for i, c in enumerate(curve.h))
            f = sum(c * x**i for i, c in enumerate(curve.f))
            # the two equations differ by a constant factor
            assert model_y**2 + h * model_y - f == value * curve.y_scale**2 / 3


def candidate_at(point: str, prime: int, precision: int, folder: Path) -> Candidate:
    document = {
        "format": "sieve-candidates/1", "prime": prime, "precision": precision, "complete": False,
        "source": "test", "candidates": [{"id": "z", "point": point}],
    }  # fmt: skip
    path = folder / "candidates.json"
    path.write_text(json.dumps(document), "utf-8")
    return load_candidates(path).candidates[0]


CURVES = [
    SEXTIC,
    "y^2 + (x^3 + x + 1)*y = x^5 + x",
    "y^2 = x^5 + 1",
    "9*y^2 = x^6 + 8*x + 16",
    "y^2 = x^8 + x + 4",
]


@pytest.mark.parametrize("equation", CURVES)
def test_padic_points_on_and_off_the_curve(equation: str, tmp_path: Path) -> None:
    curve = curve_of(equation)
    rng = random.Random(equation)
    seen = set()
    for prime in (3, 5, 7, 13):
        if not curve.is_smooth(prime) or curve.y_scale % prime == 0:
            continue
        for _ in range(12):
            lifted = random_padic_point(curve, prime, 6, rng)
            if lifted is None:
                continue
            x, y, z = lifted
            seen.add(z.is_zero or z.valuation > 0)
            forms = [f"({x} : {y} : {z})"]
            if not z.is_zero:
                forms.append(f"({x / z}, {y / z ** (curve.genus + 1)})")
            scale = rng.choice([prime, Fraction(1, prime), 2])
            forms.append(f"({x * scale} : {y * Fraction(scale) ** (curve.genus + 1)} : {z * scale})")
            for form in forms:
                candidate = candidate_at(form, prime, 30, tmp_path)
                a, b, c = model_coordinates(curve, candidate)
                assert min(a.valuation, c.valuation) == 0 and b.is_integral
                model_y = y * curve.y_scale
                # the same point: cross products in weighted coordinates
                assert (a * z).agrees(c * x)
                assert (b * (z if z.valuation == 0 else x) ** (curve.genus + 1)).agrees(
                    model_y * (c if z.valuation == 0 else a) ** (curve.genus + 1)
                )
            off = y + PadicNumber.padic(prime, rng.randrange(1, prime), rng.randint(0, 2), 6)
            if derivative_is_unit(curve, x, y, z):
                with pytest.raises(InputError, match="not on the curve"):
                    check_on_curve(curve, candidate_at(f"({x} : {off} : {z})", prime, 30, tmp_path))
    assert seen == {True, False} or equation == "y^2 = x^5 + 1"


def derivative_is_unit(curve: HyperellipticCurve, x: PadicNumber, y: PadicNumber, z: PadicNumber) -> bool:
    h = sum(c * x.residue(1) ** i * z.residue(1) ** (curve.genus + 1 - i) for i, c in enumerate(curve.h))
    return (2 * (y * curve.y_scale).residue(1) + h) % x.prime != 0


def random_padic_point(
    curve: HyperellipticCurve, prime: int, precision: int, rng: random.Random
) -> tuple[PadicNumber, PadicNumber, PadicNumber] | None:
    """A point modulo prime^precision in the user's coordinates, by exhaustive digit-by-digit lifting of y."""
    g, modulus = curve.genus, prime**precision
    x, z = (1, prime * rng.randrange(modulus)) if rng.random() < 0.3 else (rng.randrange(modulus), 1)
    h = sum(c * x**i * z ** (g + 1 - i) for i, c in enumerate(curve.h))
    f = sum(c * x**i * z ** (2 * g + 2 - i) for i, c in enumerate(curve.f))
    lifts = [0]
    for k in range(precision):
        q = prime ** (k + 1)
        tries = [y + d * prime**k for y in lifts for d in range(prime)]
        lifts = [y for y in tries if (y * y + h * y - f) % q == 0][:50]
    if not lifts:
        return None
    y = rng.choice(lifts)
    numbers = [PadicNumber.padic(prime, n, 0, precision) for n in (x, y, z)]
    return numbers[0], numbers[1] / curve.y_scale, numbers[2]


def test_every_kind_of_candidate(tmp_path: Path) -> None:
    document = {
        "format": "sieve-candidates/1", "prime": 7, "precision": 6, "complete": True, "source": "test",
        "candidates": [
            {"id": "z1", "point": "(0 + O(7^3), 1)", "multiplicity": 2},
            {"id": "z2", "disc": "(1, 3)", "at_most": 1},
            {
                "id": "z3", "coefficients": ["12", "5 + 3*7 + O(7^4)", -1], "torsion": [0, -2],
                "disc": "(1 : 1 : 0)",
            },
        ],
    }  # fmt: skip
    path = tmp_path / "candidates.json"
    path.write_text(json.dumps(document), "utf-8")
    file = load_candidates(path)
    assert (file.prime, file.precision, file.complete, file.source) == (7, 6, True, "test")
    first, second, third = file.candidates
    assert (first.kind, first.multiplicity, first.at_most) == ("point", 2, None)
    assert first.point is not None and [c.precision for c in first.point.entries] == [3, 6]
    assert (second.kind, second.multiplicity, second.at_most) == ("disc", 1, 1)
    assert third.kind == "coefficients" and third.torsion == (0, -2)
    assert [c.precision for c in third.coefficients] == [6, 4, 6]
    curve = curve_of(SEXTIC)
    assert disc_residues(curve, second) == (1, 3, 1) and disc_residues(curve, third) == (1, 1, 0)
    check_candidates(file, curve, 3, (2, 4))
    with pytest.raises(InputError, match="no point"):
        model_coordinates(curve, second)
    with pytest.raises(InputError, match="no disc"):
        disc_residues(curve, first)
    for rank, torsion in [(2, (2, 4)), (3, (2,)), (3, ())]:
        with pytest.raises(InputError, match="one for each"):
            check_candidates(file, curve, rank, torsion)


def test_discs_are_read_in_weighted_coordinates(tmp_path: Path) -> None:
    document = {
        "format": "sieve-candidates/1", "prime": 7, "precision": 3, "complete": False, "source": "test",
        "candidates": [{"id": "a", "disc": "(3 : 27*3 : 3)"}, {"id": "b", "disc": "(1/2 : 1/8 : 0)"}],
    }  # fmt: skip
    path = tmp_path / "candidates.json"
    path.write_text(json.dumps(document).replace("27*3", "81"), "utf-8")
    curve = curve_of(SEXTIC)
    assert [disc_residues(curve, c) for c in load_candidates(path).candidates] == [(1, 3, 1), (1, 1, 0)]


def test_a_prime_in_the_change_of_variables_is_refused(tmp_path: Path) -> None:
    document = {
        "format": "sieve-candidates/1", "prime": 7, "precision": 3, "complete": False, "source": "test",
        "candidates": [{"id": "a", "disc": "(0 : 0 : 1)"}],
    }  # fmt: skip
    path = tmp_path / "candidates.json"
    path.write_text(json.dumps(document), "utf-8")
    curve = curve_of("49*y^2 = x^5 + 1")
    with pytest.raises(InputError, match="change of variables"):
        check_candidates(load_candidates(path), curve, 0, ())


def test_the_demo_files_are_read() -> None:
    demo = Path(__file__).resolve().parents[2] / "data" / "demo"
    problem = read_case(demo / "case.toml")
    file = load_candidates(demo / "candidates.json")
    check_candidates(file, problem.curve, problem.case.rank, ())
    assert len(file.candidates) >= 25 and len(problem.known_points) >= 10
