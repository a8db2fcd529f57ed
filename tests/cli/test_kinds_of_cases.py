"""Whole runs on cases of many kinds: parities, genera, h, torsion, rank 0, divisors, denominators."""

from __future__ import annotations

import json
import random
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from flint import fmpq, fmpq_poly

from sieve.curves.hyperelliptic import HyperellipticCurve
from tests.support.command_line import SEXTIC, SEXTIC_POINTS, case_text, sieve
from tests.support.reference_cases import reference_case
from tests.support.run_files import chabauty_prime, random_points, write_candidates, write_case, write_json

BASE = '"(1 : 1 : 0)"'
BY_POINTS = """
[[jacobian.generators]]
divisor = [[1, "(1 : 1 : 0)"], [-1, "(0 : 1 : 1)"]]
[[jacobian.generators]]
divisor = [[1, "(1 : 1 : 0)"], [-1, "(0 : -1 : 1)"]]
"""


def run(case: Path, candidates: Path, output: Path, *more: str) -> tuple[int, dict[str, Any]]:
    done = sieve("run", case, "-c", candidates, "-o", output, "--jobs", "1", "--json", *more)
    assert done.code in (0, 1), done.err
    return done.code, json.loads(done.out)


def sextic_curve() -> HyperellipticCurve:
    return HyperellipticCurve([1, -2, 1, 2, 2, 4, 1])


def sextic_candidates(path: Path, p: int = 11) -> Path:
    """The known points, then random ones."""
    texts = [*SEXTIC_POINTS, *random_points(sextic_curve(), p, 5, 12, 5)]
    return write_json(path, p, 5, [{"id": f"z{i}", "point": t} for i, t in enumerate(texts)], True)


def sextic_run(directory: Path, base: str, more: str) -> tuple[int, dict[str, Any]]:
    directory.mkdir()
    case = directory / "case.toml"
    case.write_text(case_text(SEXTIC, 2, base, known=SEXTIC_POINTS, more=more), "utf-8")
    return run(case, sextic_candidates(directory / "c.json"), directory / "out", "--bound", "300")


def verdicts(data: dict[str, Any]) -> dict[str, str]:
    return {v["id"]: v["verdict"] for v in data["verdicts"]}


@pytest.fixture(scope="module")
def plain(tmp_path_factory: pytest.TempPathFactory) -> dict[str, str]:
    """The verdicts with point differences as generators and a rational point as base."""
    _, data = sextic_run(tmp_path_factory.mktemp("plain") / "x", BASE, BY_POINTS)
    found = verdicts(data)
    assert [found[f"z{i}"] for i in range(10)] == ["rational"] * 10
    assert list(found.values()).count("eliminated") >= 10
    return found


def test_generators_from_known_points(plain: dict[str, str], tmp_path: Path) -> None:
    _, data = sextic_run(tmp_path / "x", BASE, 'generators_from = "known_points"')
    assert verdicts(data) == plain


@pytest.mark.parametrize(
    "place",
    [
        '{ mumford = ["x^2 - x", "2*x + 1"] }',
        '{ root_of = "t^2 - t", point = "(t : 2*t + 1 : 1)" }',
        '{ root_of = "t^2 - t", point = "(3*t : 27*(2*t + 1) : 3)" }',
        '{ mumford = ["2*x^2 - 2*x", "2*x + 1"] }',
    ],
)
def test_closed_points_as_generators(place: str, plain: dict[str, str], tmp_path: Path) -> None:
    """(0 : 1 : 1) + (1 : 3 : 1) minus the points at infinity, and another generator: the same group."""
    generators = f"""
[[jacobian.generators]]
divisor = [[1, {place}], [-1, "(1 : 1 : 0)"], [-1, "(1 : -1 : 0)"]]
[[jacobian.generators]]
divisor = [[1, "(1 : 1 : 0)"], [-1, "(0 : -1 : 1)"]]
"""
    _, data = sextic_run(tmp_path / "x", BASE, generators)
    assert verdicts(data) == plain


def residual_cubic() -> tuple[str, str]:
    """The three other zeros of a section through three known points, as a closed point."""
    f = fmpq_poly([1, -2, 1, 2, 2, 4, 1])
    x = fmpq_poly([0, 1])
    # through (0, 1), (1, 3), (-1, -1)
    c = 1 + 2 * x
    rest = (c * c - f) / (x * (x - 1) * (x + 1))
    assert rest.degree() == 3 and len(rest.factor()[1]) == 1

    def text(p: fmpq_poly) -> str:
        return " + ".join(
            f"({Fraction(int(a.p), int(a.q))})*t^{i}" for i, a in enumerate(p.coeffs()) if a != fmpq(0)
        )

    return text(rest), text(c % rest)


def test_a_base_that_is_no_rational_point(plain: dict[str, str], tmp_path: Path) -> None:
    """A closed point of degree 3 minus a fibre: the classes move by an element of the group."""
    cubic, y = residual_cubic()
    place = f'{{ root_of = "{cubic}", point = "(t : {y} : 1)" }}'
    fibre = '{ root_of = "t^2 - 1", point = "(1 : t : 0)" }'
    _, data = sextic_run(tmp_path / "x", f"[[1, {place}], [-1, {fibre}]]", BY_POINTS)
    assert verdicts(data) == plain
    _, data = sextic_run(
        tmp_path / "y", f'[[1, {place}], [-1, "(2 : 0 : 0)"]]'.replace('"(2 : 0 : 0)"', fibre),
        'generators_from = "known_points"',
    )  # fmt: skip
    found = verdicts(data)
    assert [found[f"z{i}"] for i in range(10)] == ["rational"] * 10


def test_rational_coefficients(plain: dict[str, str], tmp_path: Path) -> None:
    """y is a sixth of the model's y; points, divisors and candidates are in the user's coordinates."""
    directory = tmp_path
    equation = "y^2 = (" + SEXTIC.partition(" = ")[2] + ")/36"

    def sixth(text: str) -> str:
        x, y, z = text.strip("()").split(" : ")
        return f"({x} : {Fraction(y) / 6} : {z})"

    base = '"(1 : 1/6 : 0)"'
    more = BY_POINTS.replace("1 : 1 : 0", "1 : 1/6 : 0").replace("0 : 1 : 1", "0 : 1/6 : 1")
    more = more.replace("0 : -1 : 1", "0 : -1/6 : 1")
    case = directory / "case.toml"
    case.write_text(case_text(equation, 2, base, known=[sixth(p) for p in SEXTIC_POINTS], more=more), "utf-8")
    rng = random.Random(3)
    curve, p = sextic_curve(), 7
    points = []
    for text in random_points(curve, p, 6, 12, rng.randrange(100)):
        x, y, z = (part.partition(" + O")[0] for part in text.strip("()").split(" : "))
        y6 = int(y) * pow(6, -1, p**6) % p**6
        points.append(f"({x} + O(7^6) : {y6} + O(7^6) : {z} + O(7^6))")
    texts = [*map(sixth, SEXTIC_POINTS), *points]
    path = write_json(
        directory / "c.json", p, 6, [{"id": f"z{i}", "point": t} for i, t in enumerate(texts)], True
    )
    _, data = run(case, path, directory / "out", "--bound", "300")
    found = verdicts(data)
    assert [found[f"z{i}"] for i in range(10)] == ["rational"] * 10
    assert data["verdicts"][0]["point"] == sixth(SEXTIC_POINTS[0])
    assert list(found.values()).count("eliminated") >= 6
    # 3 divides the change of variables
    bad = sextic_candidates(directory / "d.json", 3)
    done = sieve("run", case, "-c", bad, "-o", directory / "out", "--jobs", "1")
    assert done.code == 2 and done.err.count("\n") == 1 and "change of variables" in done.err


@pytest.mark.parametrize(
    "name",
    [
        "integral_g2",  # odd degree
        "integral_g3",  # genus 3, torsion
        "lmfdb2059",  # h, odd degree, torsion
        "lmfdb100154",  # h, even degree
        "lmfdb123201c",  # deg f < 2 g + 1, h of degree 3
        "bielliptic_137",  # torsion of order 2
        "X0_37",  # rank 1, torsion of order 3
        "five_roots_0_1_2_5_6",  # all 2-torsion rational
        "X0star129",  # the prime 2
    ],
)
def test_reference_curves(name: str, tmp_path: Path) -> None:
    case = reference_case(name)
    if case.rank is None:
        pytest.skip("no rank is recorded")
    p = chabauty_prime(case)
    digits = {2: 12, 3: 8}.get(p, 5)
    candidates = write_candidates(case, tmp_path, p, digits, 10)
    code, data = run(write_case(case, tmp_path), candidates, tmp_path / "out", "--bound", "150")
    random_ones = list(data["verdicts"])[-10:]
    for verdict in data["verdicts"][:-10]:
        assert verdict["verdict"] == "rational" and verdict["given"]
    assert code == (1 if data["counts"]["open"] else 0)
    assert all(v["verdict"] != "rational" for v in random_ones)


@pytest.mark.parametrize("name", ["X1_13", "X1_16"])
def test_rank_zero(name: str, tmp_path: Path) -> None:
    """All points are torsion; every other candidate is eliminated, and X(Q) is the list in print."""
    case = reference_case(name)
    p = chabauty_prime(case)
    candidates = write_candidates(case, tmp_path, p, 4, 20)
    code, data = run(write_case(case, tmp_path), candidates, tmp_path / "out")
    assert code == 0
    known = [v for v in data["verdicts"] if v["verdict"] == "rational"]
    assert len(known) == len(data["verdicts"]) - 20 == len(data["rational_points"])
    assert f"exactly {len(known)} points" in data["statement"]
    assert "torsion" in {premise["id"] for premise in data["premises"] if premise["status"] == "proved"}


def test_discs_and_coefficients(tmp_path: Path) -> None:
    """The three kinds of candidates in one file; a whole disc without a bound is rational but not sole."""
    directory = tmp_path
    case = directory / "case.toml"
    case.write_text(case_text(SEXTIC, 2, BASE, known=SEXTIC_POINTS, more=BY_POINTS), "utf-8")
    entries: list[dict[str, object]] = [
        {"id": "disc", "disc": "(0 : 1 : 1)"},
        {"id": "bounded", "disc": "(0 : 6 : 1)", "at_most": 1},
        {"id": "short", "coefficients": ["-1 + O(7^5)", "0 + O(7^5)"], "torsion": []},
        {"id": "placed", "coefficients": ["-1", "0"], "disc": "(0 : 1 : 1)"},
        {"id": "wrong disc", "coefficients": ["-1", "0"], "disc": "(0 : 6 : 1)"},
        {"id": "far", "coefficients": ["3 + 2*7 + 4*7^2 + 7^3 + O(7^5)", "5 + 6*7 + 2*7^3 + 7^4 + O(7^5)"]},
        {"id": "double", "point": "(0, 1)", "multiplicity": 2},
    ]
    path = write_json(directory / "c.json", 7, 6, entries, False)
    _, data = run(case, path, directory / "out", "--bound", "200")
    found = {v["id"]: v for v in data["verdicts"]}
    kinds = {name: v["verdict"] for name, v in found.items()}
    assert kinds.pop("far") in ("eliminated", "open") and kinds.pop("wrong disc") == "eliminated"
    assert set(kinds.values()) == {"rational"}
    assert found["bounded"]["sole"] and found["bounded"]["point"] == "(0 : -1 : 1)"
    assert not found["disc"]["sole"] and not found["double"]["sole"]
    assert found["double"]["reason"] and found["disc"]["reason"]
