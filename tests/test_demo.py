"""The files of the demo are what its scripts and its README say they are."""

from __future__ import annotations

import importlib.util
import json
import tomllib
from fractions import Fraction
from math import gcd
from pathlib import Path
from types import ModuleType

import pytest
from flint import nmod_mat

from tests.support.cantor import CantorJacobian
from tests.support.pari import jacobian_order
from tests.support.pohlig_hellman import GroupOracle
from tests.support.reference_cases import primes

ROOT = Path(__file__).resolve().parent.parent
DEMO = ROOT / "data" / "demo"


def script(name: str) -> ModuleType:
    spec = importlib.util.spec_from_file_location(name, ROOT / "scripts" / f"{name}.py")
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


CANDIDATES = script("demo_candidates")


def case() -> dict[str, dict[str, object]]:
    return tomllib.loads((DEMO / "case.toml").read_text("utf-8"))


def value(text: str, p: int) -> int:
    """An expansion modulo p^6, read with a few lines of its own."""
    *terms, error = text.split(" + ")
    assert error == f"O({p}^6)"
    total = 0
    for term in terms:
        digit, star, power = term.partition("*")
        if not star:
            digit, power = (term, "1") if term.isdigit() and int(term) < p else ("1", term)
        base, _, exponent = power.partition("^")
        assert 0 < int(digit) < p
        total += int(digit) * int(base) ** int(exponent or 1)
    return total


def test_the_list_is_the_output_of_its_script() -> None:
    assert (DEMO / "candidates.json").read_text("utf-8") == CANDIDATES.rendered(5)
    assert "INVENTED" in CANDIDATES.document(5)["source"]


@pytest.mark.parametrize("p", [5, 7, 11, 13])
def test_every_candidate_lies_on_the_curve_and_every_known_point_in_the_list(p: int) -> None:
    document = json.loads(CANDIDATES.rendered(p))
    modulus = p**6
    points = set()
    for candidate in document["candidates"]:
        text = candidate["point"][1:-1]
        if ":" in text:
            x, y, z = (value(part, p) if "O(" in part else int(part) for part in text.split(" : "))
        else:
            x, y, z = *(value(part, p) for part in text.split(", ")), 1
        assert (y * y - x**6 - x**4 * z**2 + 2 * x**2 * z**4 - 9 * z**6) % modulus == 0
        points.add((x, y, z))
    assert len(points) == len(document["candidates"]) == 48
    assert {CANDIDATES.normalised(*point, p) for point in CANDIDATES.KNOWN} <= points


def test_spurious_points_come_close_to_known_ones() -> None:
    """Every spurious point shares its disc with a known one, some two digits, none three."""
    known = [CANDIDATES.normalised(*point, 5) for point in CANDIDATES.KNOWN]
    spurious = CANDIDATES.spurious(5, CANDIDATES.random.Random(CANDIDATES.SEED))

    def close(digits: int) -> int:
        near = {tuple(c % 5**digits for c in point) for point in known}
        return sum(tuple(c % 5**digits for c in point) in near for point in spurious)

    assert (len(spurious), close(1), close(3)) == (32, 32, 0)
    assert close(2) >= 3


def test_each_disc_at_five_holds_a_known_point() -> None:
    def disc(point: tuple[int, int, int]) -> tuple[int, ...]:
        return tuple(c % 5 for c in CANDIDATES.normalised(*point, 5))

    points = CantorJacobian(5, CANDIDATES.F, [], 2).points
    assert {disc(point) for point in CANDIDATES.KNOWN} == {disc(point) for point in points}


def test_known_points_of_the_case_are_those_of_the_script() -> None:
    known = set()
    for text in case()["known_points"]:
        if ":" in text:
            known.add(tuple(int(c) for c in text[1:-1].split(" : ")))
        else:
            x, y = (Fraction(c) for c in text[1:-1].split(", "))
            known.add((x.numerator, int(y * x.denominator**3), x.denominator))
    assert known == set(CANDIDATES.KNOWN)


def test_rank_is_proved_and_cited_as_proved(capsys: pytest.CaptureFixture[str]) -> None:
    source = script("demo_rank").rank_source()
    assert case()["jacobian"]["rank_source"] == source
    assert case()["jacobian"]["rank"] == 2
    assert capsys.readouterr().out.count("1 <= rank <= 1") == 2


def test_no_torsion() -> None:
    assert gcd(jacobian_order(7, CANDIDATES.F, ()), jacobian_order(19, CANDIDATES.F, ())) == 1


@pytest.mark.parametrize("ell", [2, 3, 5, 7, 11, 13])
def test_generators_are_saturated(ell: int) -> None:
    """G / ell G injects into the product of the J(F_v) / ell; without torsion ell is prime to the index."""
    rows: list[list[int]] = [[], []]
    for v in sorted(set(primes(150)) - {2, 3, 31}):
        order = jacobian_order(v, CANDIDATES.F, ())
        if order % ell:
            continue
        J = CantorJacobian(v, CANDIDATES.F, [], 2)
        group = GroupOracle(J, order)
        for row, point in zip(rows, ((0, 3, 1), (-1, -3, 1)), strict=True):
            logs = group.logarithm(J.of_divisor([(1, point), (-1, (1, 1, 0))]))
            row += [c for c, m in zip(logs, group.moduli, strict=True) if m % ell == 0]
    assert nmod_mat([[c % ell for c in row] for row in rows], ell).rank() == 2
