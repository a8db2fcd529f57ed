"""Plane curves on the command line, from an equation to an appendix."""

from __future__ import annotations

import json
import shutil
import subprocess
import tomllib
from pathlib import Path

import pytest

from sieve.proof.checker import main as check_main
from tests.support.command_line import sieve
from tests.support.plane_cases import (
    plane_case_text,
    quartic_case,
    write_plane_candidates,
    write_quartic,
)

EVEN = {
    # J is isogenous to the product of the Jacobians of the quotients by x -> -x, y -> -y, z -> -z
    "even_rank1": (1, "3*x^4 - y^4 - z^4 + 3*x^2*y^2 - 2*x^2*z^2 + y^2*z^2 = 0"),
    "even_rank2": (2, "3*x^4 - y^4 - 3*z^4 + x^2*y^2 + 2*x^2*z^2 - 2*y^2*z^2 = 0"),
}


def quotient(a: int, b: int, c: int, d: int, e: int, f: int) -> list[int]:
    """W^2 = q(y), the quotient of a x^4 + b y^4 + c z^4 + d x^2 y^2 + e x^2 z^2 + f y^2 z^2 by x -> -x."""
    return [e * e - 4 * a * c, 0, 2 * d * e - 4 * a * f, 0, d * d - 4 * a * b]


@pytest.mark.parametrize("name", sorted(EVEN))
def test_ranks(name: str) -> None:
    """PARI's ellrank proves the ranks of the Jacobians y^2 = x^3 - 27 I x - 27 J of the quotients."""
    pari = pytest.importorskip("cypari").pari
    a, b, c, d, e, f = {"even_rank1": (3, -1, -1, 3, -2, 1), "even_rank2": (3, -1, -3, 1, 2, -2)}[name]
    total = 0
    for q in (quotient(a, b, c, d, e, f), quotient(b, a, c, d, f, e), quotient(c, a, b, e, f, d)):
        k0, _, k2, _, k4 = q
        first, second = 12 * k4 * k0 + k2 * k2, 72 * k4 * k2 * k0 - 2 * k2**3
        found = pari.ellrank(pari.ellinit([-27 * first, -27 * second]))
        assert int(found[0]) == int(found[1])
        total += int(found[0])
    assert total == EVEN[name][0]


def sketch(name: str, directory: Path) -> Path:
    rank, equation = EVEN[name]
    path = directory / f"{name}.sketch.toml"
    path.write_text(
        f'format = "sieve-case/1"\nname = "{name}"\n[curve]\nequation = "{equation}"\n'
        f'[jacobian]\nrank = {rank}\nrank_source = "three elliptic quotients"\n', "utf-8")  # fmt: skip
    return path


@pytest.fixture(scope="module")
def quartic(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The case of the split curve of level 13, with a run over 7-adic candidates."""
    directory = tmp_path_factory.mktemp("quartic")
    case = write_quartic(quartic_case("level13_split"), directory)
    write_plane_candidates(case, directory / "c.json", 5, 5, 12)
    done = sieve("run", case, "-c", directory / "c.json", "-o", directory / "out", "--jobs", "1",
                 "--bound", "300", "--json")  # fmt: skip
    assert done.code in (0, 1), done.err
    (directory / "result.json").write_text(done.out, "utf-8")
    return directory


def test_run_of_a_quartic(quartic: Path) -> None:
    data = json.loads((quartic / "result.json").read_text("utf-8"))
    verdicts = {v["id"]: v["verdict"] for v in data["verdicts"]}
    assert [verdicts[f"z{i}"] for i in range(1, 8)] == ["rational"] * 7
    assert list(verdicts.values()).count("eliminated") >= 10
    # 7 points: the published X(Q) (Balakrishnan, Dogra, Mueller, Tuitman, Vonk 2019)
    assert set(data["rational_points"]) == {
        "(0 : 0 : 1)", "(0 : 1 : 0)", "(0 : 3 : 2)", "(-1 : 0 : 1)", "(1 : 0 : 0)", "(1 : 0 : 1)",
        "(1 : 1 : 0)",
    }  # fmt: skip
    report = (quartic / "out" / "report.txt").read_text("utf-8")
    assert "genus 3" in report and "(0 : 1 : 0)" in report


def test_the_log_is_accepted(quartic: Path, capsys: pytest.CaptureFixture[str]) -> None:
    log = quartic / "out" / "proof.jsonl"
    done = sieve("check", log, "--json")
    assert done.code == 0 and json.loads(done.out)["valid"]
    assert check_main([str(log)]) == 0
    assert capsys.readouterr().out.startswith("accepted")
    # the order of lines matters
    lines = log.read_text("utf-8").splitlines()
    bad = quartic / "bad.jsonl"
    bad.write_text("\n".join([*lines[:-2], lines[-1]]) + "\n", "utf-8")
    assert sieve("check", bad).code == 3


def test_appendix_and_drawing(quartic: Path) -> None:
    log = quartic / "out" / "proof.jsonl"
    texts = {}
    for ending in ("tex", "md", "html"):
        assert sieve("appendix", log, "-o", quartic / f"a.{ending}").code == 0
        texts[ending] = (quartic / f"a.{ending}").read_text("utf-8")
    assert "-x^{3}y - x^{3}z + 2x^{2}y^{2}" in texts["md"] and "plane projective equation" in texts["md"]
    assert "(x : y : z)" in texts["tex"] and "(-1 : 0 : 1)" in texts["md"]
    assert "<sup>3</sup>" in texts["html"]
    for ending in ("svg", "tex", "graphml"):
        assert sieve("draw", log, "-o", quartic / f"g.{ending}").code == 0


@pytest.mark.skipif(shutil.which("pdflatex") is None, reason="no TeX here")
def test_the_appendix_compiles(quartic: Path) -> None:
    log = quartic / "out" / "proof.jsonl"
    assert sieve("appendix", log, "-o", quartic / "compiled.tex").code == 0
    done = subprocess.run(
        ["pdflatex", "-interaction=nonstopmode", "-halt-on-error", "compiled.tex"],
        cwd=quartic, capture_output=True, timeout=300, check=False,
    )  # fmt: skip
    assert done.returncode == 0, done.stdout[-2000:]


def test_inspect_and_advise(quartic: Path) -> None:
    case = quartic / "level13_split.toml"
    done = sieve("inspect", case, "--bound", "60", "--padic", "5:6", "--jobs", "1", "--json")
    assert done.code == 0, done.err
    data = json.loads(done.out)
    assert data["genus"] == 3 and data["bad_primes"] == [13]
    assert data["torsion"] == {"order": "1", "proved": True}
    # orders: L(1) of the reference data, at 3, 5, 7
    orders = {row["prime"]: row["order"] for row in data["primes"]}
    assert (orders[3], orders[5], orders[7]) == ("91", "377", "659")
    assert all(d.keys() == {"prime", "precision", "group", "coefficients"} for d in data["padic"])
    for row, known in zip(data["padic"][0]["coefficients"], data["known_points"], strict=True):
        assert row["point"] == known["point"] and len(row["coefficients"]) == 3
    done = sieve("advise", case, "-c", quartic / "c.json", "--bound", "300", "--jobs", "1", "--json")
    assert done.code == 0 and json.loads(done.out)["advice"]


GENERATED = {
    "even_rank1": """[[jacobian.generators]]
divisor = [[1, "(-1 : -2 : 1)"], [-1, "(-1 : 0 : 1)"]]
[[jacobian.torsion]]
order = 2
divisor = [[1, { root_of = "t^2 + 1/4", point = "(-t : 1 : t - 1)" }],
           [1, { root_of = "t^2 + 1/4", point = "(t : -1 : t - 1)" }], [-4, "(-1 : 0 : 1)"]]
[[jacobian.torsion]]
order = 8
divisor = [[1, "(-1 : -2 : 1)"], [-2, "(-1 : 0 : 1)"], [1, "(1 : 2 : 1)"]]
""",
    "even_rank2": """[[jacobian.generators]]
divisor = [[-1, "(-1 : -1 : 1)"], [1, "(-1 : 1 : 1)"]]
[[jacobian.generators]]
divisor = [[-1, "(-1 : -1 : 1)"], [1, "(1 : -1 : 1)"]]
[[jacobian.torsion]]
order = 4
divisor = [[1, { root_of = "t^2 + 10/41*t + 9/41", point = "(2*t : -2 : 3*t + 1)" }], [-2, "(-1 : -1 : 1)"]]
""",
}
"""What the proposals are, up to the choice of torsion generators."""


def write_even(name: str, directory: Path) -> Path:
    points, base = {
        "even_rank1": (["(-1 : 0 : 1)", "(1 : 0 : 1)", "(-1 : -2 : 1)", "(-1 : 2 : 1)", "(1 : -2 : 1)",
                        "(1 : 2 : 1)"], "(-1 : 0 : 1)"),
        "even_rank2": (["(-1 : -1 : 1)", "(-1 : 1 : 1)", "(1 : -1 : 1)", "(1 : 1 : 1)"], "(-1 : -1 : 1)"),
    }[name]  # fmt: skip
    text = sketch(name, directory).read_text("utf-8")
    text = text.replace("[curve]", f"known_points = {json.dumps(points)}\n[curve]")
    path = directory / f"{name}.toml"
    path.write_text(text + f'base = "{base}"\n' + GENERATED[name], "utf-8")
    return path


@pytest.mark.slow
@pytest.mark.parametrize("name", sorted(EVEN))
def test_proposals(name: str, tmp_path: Path) -> None:
    done = sieve("inspect", sketch(name, tmp_path), "--propose", "--jobs", "1", "--json")
    assert done.code == 0, done.err
    found, expected = json.loads(done.out), tomllib.loads(write_even(name, tmp_path).read_text("utf-8"))
    assert found["generators"] == [g["divisor"] for g in expected["jacobian"]["generators"]]
    # the same group in another basis is as good: `inspect` proves the orders of the stored one
    assert [t["order"] for t in found["torsion"]] == [t["order"] for t in expected["jacobian"]["torsion"]]
    assert found["base"] == expected["jacobian"]["base"] and found["known_points"] == expected["known_points"]


@pytest.mark.parametrize(("name", "prime"), [("even_rank1", "5"), ("even_rank2", "11")])
def test_from_an_equation_to_all_points(name: str, prime: str, tmp_path: Path) -> None:
    """Find the zeros of annihilating integrals, decide them."""
    case, candidates = write_even(name, tmp_path), tmp_path / "c.json"
    found = sieve("candidates", case, "-o", candidates, "--prime", prime, "--jobs", "1")
    assert found.code == 0, found.err
    assert "dX/F_Y" in found.out
    done = sieve("run", case, "-c", candidates, "-o", tmp_path / "out", "--jobs", "1", "--bound", "150",
                 "--json")  # fmt: skip
    data = json.loads(done.out)
    assert done.code == 0 and data["counts"]["open"] == 0
    expected = 6 if name == "even_rank1" else 4
    assert data["counts"]["rational"] == len(data["rational_points"]) == expected
    assert data["statement"].startswith(f"X(Q) has exactly {expected} points")
    assert sieve("check", tmp_path / "out" / "proof.jsonl").code == 0


def test_own_variables_go_through_everything(tmp_path: Path) -> None:
    curve = quartic_case("level13_split")
    text = plane_case_text(curve.curve, "own", 3, curve.known_points)
    equation = next(line for line in text.splitlines() if line.startswith("equation"))
    changed = equation.translate(str.maketrans({"x": "u", "y": "v", "z": "w"}))
    text = text.replace(equation, changed)
    text = text.replace('["x", "y", "z"]', '["u", "v", "w"]')
    case = tmp_path / "own.toml"
    case.write_text(text, "utf-8")
    write_plane_candidates(case, tmp_path / "c.json", 5, 4, 3)
    done = sieve("run", case, "-c", tmp_path / "c.json", "-o", tmp_path / "out", "--jobs", "1",
                 "--bound", "150")  # fmt: skip
    assert done.code in (0, 1) and "u^3*v" in done.out
    log = tmp_path / "out" / "proof.jsonl"
    checked = sieve("check", log)
    assert checked.code == 0 and "u^3*v" in checked.out
    assert sieve("appendix", log, "-o", tmp_path / "a.md").code == 0
    assert "(u : v : w)" in (tmp_path / "a.md").read_text("utf-8")


def test_a_quintic_of_genus_six(tmp_path: Path) -> None:
    """Three points on a quintic: found again among the classes that survive, in a log of exact sections.

    The rank is that of the group of the three points; it is a premise of the test alone.
    """
    case = tmp_path / "quintic.toml"
    case.write_text("""format = "sieve-case/1"
name = "quintic"
known_points = ["(0 : 1 : 1)", "(1 : -1 : 0)", "(1 : 0 : 1)"]
[curve]
equation = "x^5 + y^5 - z^5 + x*y*z^3 - x^2*y^2*z = 0"
[jacobian]
rank = 2
rank_source = "a premise of the test"
base = "(0 : 1 : 1)"
generators_from = "known_points"
""", "utf-8")
    done = sieve("run", case, "-o", tmp_path / "out", "--bound", "300", "--jobs", "1", "--json")
    assert done.code == 1, done.err
    data = json.loads(done.out)
    # one class for each known point, and few others
    assert [["0", "0"], ["0", "1"], ["1", "0"]] == sorted(data["survivors"]["vectors"][:3])
    assert int(data["survivors"]["quotient"]) > 10**9
    checked = sieve("check", tmp_path / "out" / "proof.jsonl", "--json")
    assert checked.code == 0 and "of genus 6" in json.loads(checked.out)["statement"]
