"""Case and candidate files of plane curves: equations in any variables, points in every chart, places."""

from __future__ import annotations

import json
import random
from fractions import Fraction
from pathlib import Path

import pytest

from sieve.curves.divisors import ClosedPlace, RationalPlace
from sieve.curves.notation import Origin
from sieve.curves.plane import PlaneCurve
from sieve.errors import InputError
from sieve.files.candidates import check_candidates, disc_residues, load_candidates, model_coordinates
from sieve.files.case import load_case
from sieve.files.equation import read_equation
from sieve.files.notation_out import divisor_document, divisor_text, equation_text
from sieve.files.reading import Table
from sieve.files.resolve import curve_of, read_case

BAD = Path(__file__).resolve().parents[2] / "data" / "bad"
KLEIN = {(3, 1, 0): 1, (0, 3, 1): 1, (1, 0, 3): 1}


def written(equation: str, variables: list[str] | None = None):
    curve: dict[str, object] = {"equation": equation}
    if variables is not None:
        curve["variables"] = variables
    return read_equation(Table({"curve": curve}, Origin("case.toml")))


@pytest.mark.parametrize(
    ("equation", "variables", "names", "terms"),
    [
        ("x^3*y + y^3*z + z^3*x = 0", None, ("x", "y", "z"), KLEIN),
        # x, y, z whatever the order in which they occur, and when one is first written on the right
        ("z^3*x = -y^3*z - x^3*y", None, ("x", "y", "z"), KLEIN),
        # other names: the order in which they occur
        ("u^3*v + v^3*w + w^3*u = 0", None, ("u", "v", "w"), KLEIN),
        ("a_1^3*b + b^3*c2 = -c2^3*a_1", None, ("a_1", "b", "c2"), KLEIN),
        ("x^3*y + y^3*w + w^3*x = 0", None, ("x", "y", "w"), KLEIN),
        # .. or the order that is asked for
        ("v^3*w + u^3*v + w^3*u = 0", ["u", "v", "w"], ("u", "v", "w"), KLEIN),
        ("x^3*y + y^3*z + z^3*x = 0", ["z", "x", "y"], ("z", "x", "y"), KLEIN),
        # denominators and common factors go
        ("2/3*x^3*y + 2/3*y^3*z + 2/3*z^3*x = 0", None, ("x", "y", "z"), KLEIN),
        ("(x^2 + y^2)^2 = z^4 - x*y^3", None, ("x", "y", "z"),
         {(4, 0, 0): 1, (2, 2, 0): 2, (0, 4, 0): 1, (0, 0, 4): -1, (1, 3, 0): 1}),
    ],
)  # fmt: skip
def test_equations_in_any_variables(equation, variables, names, terms) -> None:
    found = written(equation, variables)
    assert found.plane and found.variables == names
    if variables == ["z", "x", "y"]:
        # the same form, with the coordinates in another order
        terms = {(k, i, j): c for (i, j, k), c in terms.items()}
    curve = curve_of(found)
    assert isinstance(curve, PlaneCurve) and curve.key == PlaneCurve(terms).key
    assert curve.variables == names and curve.genus == 3
    again = written(equation_text(curve), list(names))
    assert curve_of(again).key == curve.key


@pytest.mark.parametrize("equation", ["y^2 = x^5 + 1", "y^2 + x*y = x^6 + 1", "0 = y^2 - x^7 - 2"])
def test_equations_in_two_variables_are_no_plane_curves(equation: str) -> None:
    found = written(equation)
    assert not found.plane and curve_of(found).weight > 1


def test_the_good_plane_files_are_good() -> None:
    problem = read_case(BAD / "good_plane.toml")
    assert problem.curve.weight == 1 and problem.curve.degree == 4
    assert problem.known_points == ((1, 0, 0), (0, 1, 0), (0, 0, 1)) and problem.base_point == (0, 0, 1)
    ((closed, point),) = [[place for _, place in d.terms] for _, d in problem.torsion]
    assert isinstance(closed, ClosedPlace) and closed.degree == 2 and isinstance(point, RationalPlace)
    file = load_candidates(BAD / "good_plane.json")
    check_candidates(file, problem.curve, 0, (14,))


def test_points_in_every_chart() -> None:
    curve = read_case(BAD / "good_plane.toml").curve
    file = load_candidates(BAD / "good_plane.json")
    points = {c.id: model_coordinates(curve, c) for c in file.candidates if c.kind == "point"}
    for name, unit in (("z1", 2), ("z2", 0), ("z3", 1), ("z5", 1)):
        point = points[name]
        assert point[unit].valuation == 0 and all(c.is_integral for c in point)
        value = sum(c * a**i * b**j * d**k for (i, j, k), c in KLEIN.items()
                    for a, b, d in [tuple(e.residue(e.precision) for e in point)])
        assert value % 5 ** min(c.precision for c in point) == 0
    # divided by 5, with fewer digits left
    assert points["z5"][0].agrees(5) and points["z5"][2].precision == 5
    discs = {c.id: disc_residues(curve, c) for c in file.candidates if c.kind == "disc"}
    assert discs == {"z4": (0, 1, 0)}


@pytest.mark.parametrize(
    ("disc", "expected"),
    [
        ("(0 : 0 : 3)", (0, 0, 1)), ("(2 : 0 : 0)", (1, 0, 0)), ("(0 : 4 : 5)", (0, 1, 0)),
        ("(0, 0)", (0, 0, 1)), ("(4 : 2 : 2)", None), ("(1 : 0 : 1)", None),
    ],
)  # fmt: skip
def test_discs_are_normalised_or_refused(disc: str, expected, tmp_path: Path) -> None:
    curve = read_case(BAD / "good_plane.toml").curve
    path = tmp_path / "c.json"
    path.write_text(json.dumps({
        "format": "sieve-candidates/1", "prime": 5, "precision": 3, "complete": False, "source": "invented",
        "candidates": [{"id": "d", "disc": disc}]}), "utf-8")  # fmt: skip
    (candidate,) = load_candidates(path).candidates
    if expected is None:
        with pytest.raises(InputError, match="not on the curve modulo 5"):
            disc_residues(curve, candidate)
    else:
        assert disc_residues(curve, candidate) == expected


def test_divisors_are_written_as_they_are_read(tmp_path: Path) -> None:
    text = (BAD / "good_plane.toml").read_text("utf-8")
    problem = read_case(BAD / "good_plane.toml")
    ((_, generator),) = problem.torsion
    document = divisor_document(problem.curve, generator)
    assert document == [
        [1, {"root_of": "t^2 + t + 1", "point": "(t : 1 : -t - 1)"}], [-2, "(0 : 0 : 1)"]
    ]  # fmt: skip
    assert divisor_text(problem.curve, generator) == (
        "[(t : 1 : -t - 1), t^2 + t + 1 = 0] - 2*(0 : 0 : 1)"
    )
    # a closed point of degree 1 is a point, coordinates may have any scale
    changed = text.replace('root_of = "t^2 + t + 1", point = "(t : 1 : -t - 1)"',
                           'root_of = "t - 1", point = "(0 : 0 : 2*t)"').replace("[-2, ", "[-1, ")
    path = tmp_path / "case.toml"
    path.write_text(changed.replace('base = "(0 : 0 : 1)"', 'base = "(0 : 2/3 : 0)"')
                    .replace('[-1, "(0 : 0 : 1)"]', '[-1, "(0 : 1 : 0)"]'), "utf-8")
    problem = read_case(path)
    assert set(problem.torsion[0][1].terms) == {(-1, RationalPlace((0, 1, 0))), (1, RationalPlace((0, 0, 1)))}
    assert problem.base_point == (0, 1, 0)


def test_integral_points_are_asked_for_by_a_key(tmp_path: Path) -> None:
    text = (BAD / "good.toml").read_text("utf-8")
    path = tmp_path / "case.toml"
    for value, expected in (("", False), ("integral = false\n", False), ("integral = true\n", True)):
        path.write_text(text.replace("[curve]", value + "[curve]", 1), "utf-8")
        assert load_case(path).integral is expected
        assert read_case(path).case.integral is expected


def test_a_point_off_the_curve_has_no_fraction_of_it() -> None:
    curve = PlaneCurve(KLEIN)
    with pytest.raises(ValueError, match="not on the curve"):
        curve.from_user(Fraction(1), Fraction(1), Fraction(1))


@pytest.mark.parametrize("name", ["good_plane.toml", "good_plane.json"])
def test_random_damage_never_crashes(name: str, tmp_path: Path) -> None:
    rng = random.Random(name)
    original = (BAD / name).read_bytes()
    path, refused = tmp_path / name, 0
    for _ in range(250):
        data = bytearray(original)
        for _ in range(rng.randint(1, 3)):
            place = rng.randrange(len(data))
            kind = rng.randrange(3)
            if kind == 0:
                data[place] = rng.choice(b"0123456789xyz+-*^():,/ \"")
            elif kind == 1:
                del data[place : place + rng.randint(1, 5)]
            else:
                data[place:place] = data[rng.randrange(len(data)) :][: rng.randint(1, 12)]
        path.write_bytes(bytes(data))
        try:
            problem = read_case(path if name.endswith("toml") else BAD / "good_plane.toml")
            file = load_candidates(path if name.endswith("json") else BAD / "good_plane.json")
            check_candidates(file, problem.curve, 0, (14,))
        except InputError as error:
            assert error.line.isprintable() and ", expected " in error.line
            refused += 1
    assert 100 < refused < 250
