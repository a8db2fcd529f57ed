"""`--json`, result.json and the other files, key by key; exit codes; options."""

from __future__ import annotations

import itertools
import json
import re
from pathlib import Path
from typing import Any

import pytest

from tests.support.command_line import (
    ROOT,
    SEXTIC,
    SEXTIC_POINTS,
    Outcome,
    case_text,
    sextic_case,
    sieve,
    sieve_process,
)

DEMO = ROOT / "data" / "demo"


def demo(output: Path, *more: str | Path) -> Outcome:
    return sieve(
        "run", DEMO / "case.toml", "-c", DEMO / "candidates.json", "-o", output, "--jobs", "1", *more
    )


@pytest.fixture(scope="module")
def done(tmp_path_factory: pytest.TempPathFactory) -> tuple[Outcome, Path]:
    output = tmp_path_factory.mktemp("demo") / "deep" / "out"
    return demo(output, "--json"), output


def one_document(text: str) -> Any:
    """The whole text is one JSON document (and no more)."""
    value, end = json.JSONDecoder().raw_decode(text)
    assert text[end:] == "\n"
    return value


def test_the_result_key_by_key(done: tuple[Outcome, Path]) -> None:
    outcome, output = done
    assert outcome.code == 0
    data = one_document(outcome.out)
    assert (output / "result.json").read_text("utf-8") == outcome.out
    assert list(data) == [
        "format", "case", "verdicts", "counts", "premises", "local", "survivors", "rational_points",
        "statement",
    ]  # fmt: skip
    assert data["format"] == "sieve-result/1"
    assert set(data["case"]) == {"name", "sha256"} and re.fullmatch("[0-9a-f]{64}", data["case"]["sha256"])
    listed = json.loads((DEMO / "candidates.json").read_text("utf-8"))["candidates"]
    assert [v["id"] for v in data["verdicts"]] == [c["id"] for c in listed]
    for verdict in data["verdicts"]:
        keys = {"prime", "id", "verdict"}
        if verdict["verdict"] == "eliminated":
            assert set(verdict) == keys | {"primes", "reason"} and verdict["reason"]
        else:
            assert verdict["verdict"] == "rational"
            assert {"point", "given", "sole"} <= set(verdict) <= keys | {"point", "given", "sole", "reason"}
    names = [v["verdict"] for v in data["verdicts"]]
    assert data["counts"] == {name: names.count(name) for name in ("eliminated", "rational", "open")}
    for premise in data["premises"]:
        assert premise["status"] in ("assumed", "proved")
        assert ("source" if premise["status"] == "assumed" else "primes") in premise
    assumed = [p["id"] for p in data["premises"] if p["status"] == "assumed"]
    assert "rank" in assumed and any("complete" in name for name in assumed)
    for group in data["local"]:
        assert list(group) == ["prime", "points", "order", "structure"]
        assert isinstance(group["prime"], int) and isinstance(group["points"], int)
        factors = [int(n) for n in group["structure"]]
        assert all(isinstance(n, str) for n in (group["order"], *group["structure"]))
        assert all(b % a == 0 for a, b in itertools.pairwise(factors)) and 1 not in factors
        product = 1
        for n in factors:
            product *= n
        assert product == int(group["order"])
    survivors = data["survivors"]
    assert list(survivors) == ["quotient", "count", "vectors", "barrier"]
    assert isinstance(survivors["quotient"], str) and isinstance(survivors["count"], int)
    assert all(isinstance(c, str) for row in survivors["vectors"] for c in row)
    assert len(data["rational_points"]) == data["counts"]["rational"] == 16
    assert "exactly 16 points" in data["statement"]


def test_the_other_files(done: tuple[Outcome, Path]) -> None:
    _, output = done
    report = (output / "report.txt").read_text("utf-8")
    data = json.loads((output / "result.json").read_text("utf-8"))
    assert data["statement"].split(":")[0] in " ".join(report.split())
    lines = (output / "proof.jsonl").read_text("utf-8").splitlines()
    assert len(lines) > 5 and all(isinstance(json.loads(line), dict) for line in lines)


def test_the_report_goes_to_standard_output(tmp_path: Path) -> None:
    outcome = demo(tmp_path / "out")
    assert outcome.out == (tmp_path / "out" / "report.txt").read_text("utf-8")
    assert outcome.err == ""


def test_the_default_output_directory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    sextic_case(tmp_path)
    assert sieve("run", "sextic.toml", "--jobs", "1", "--primes", "59").code == 1
    assert {p.name for p in (tmp_path / "test.out").iterdir()} >= {"result.json", "proof.jsonl", "report.txt"}


def test_inspect_key_by_key(tmp_path: Path) -> None:
    case = sextic_case(tmp_path)
    outcome = sieve(
        "inspect", case, "--json", "--jobs", "1", "--bound", "60", "--padic", "7:6", "--padic", "3:5"
    )
    assert outcome.code == 0 and outcome.err == ""
    data = one_document(outcome.out)
    assert set(data) >= {
        "genus", "bad_primes", "primes", "torsion", "independent", "generators", "saturated_at",
        "not_saturated_at", "known_points", "padic", "premises",
    }  # fmt: skip
    assert data["genus"] == 2 and data["bad_primes"] == [2, 67]
    assert [g["prime"] for g in data["primes"]] == [
        v for v in range(3, 60) if all(v % d for d in range(2, v))
    ]
    assert all(set(g) >= {"prime", "points", "order", "structure", "certified"} for g in data["primes"])
    structures = {g["prime"]: [int(n) for n in g["structure"]] for g in data["primes"]}
    # in print: the groups at 3, 5, 7, 11, 13 are cyclic of order 29, (Z/9)^2, 61, 139, 295
    assert [structures[p] for p in (3, 5, 7, 11, 13)] == [[29], [9, 9], [61], [139], [295]]
    assert data["torsion"] == {"order": "1", "proved": True} and data["independent"] is True
    assert len(data["generators"]) == 2
    # half of a generator is rational too, but no combination of points
    assert 3 in data["saturated_at"] and 2 in data["not_saturated_at"]
    assert [p["point"] for p in data["known_points"]] == list(SEXTIC_POINTS)
    assert [p["prime"] for p in data["padic"]] == [7, 3]
    for place in data["padic"]:
        assert set(place) >= {"prime", "precision", "group", "coefficients"}
        modulus = place["prime"] ** 3
        for entry, known in zip(place["coefficients"], data["known_points"], strict=True):
            assert entry["point"] == known["point"] and known["torsion"] == []
            for text, integer in zip(entry["coefficients"], known["coefficients"], strict=True):
                assert (padic_value(text, place["prime"]) - int(integer)) % modulus == 0
    assert any(p["id"] == "rank" for p in data["premises"])


def padic_value(text: str, p: int) -> int:
    """An expansion with nonnegative powers as an integer, read with a few lines of its own."""
    total = 0
    for term in text.split(" + "):
        if not term.startswith("O("):
            digit, star, power = term.partition("*")
            if not star:
                digit, power = ("1", term) if term.partition("^")[0] == str(p) else (term, f"{p}^0")
            total += int(digit) * p ** int(power.partition("^")[2] or 1)
    return total


def test_inspect_as_text(tmp_path: Path) -> None:
    outcome = sieve("inspect", sextic_case(tmp_path), "--jobs", "1", "--primes", "5,59", "--padic", "7:4")
    assert outcome.code == 0
    assert re.search(r"^ +59 +48 +2916 +\(?Z/54", outcome.out, re.MULTILINE)
    assert "Saturated at l = 3, " in outcome.out and "not proved at 2" in outcome.out
    assert "p = 7: J(F_p) = Z/61" in outcome.out
    assert not re.search(r"^ +61 ", outcome.out, re.MULTILINE)


# ---- exit codes and options -------------------------------------------------------------------------------


def test_open_candidates_give_exit_code_1(tmp_path: Path) -> None:
    outcome = demo(tmp_path / "out", "--json", "--primes", "7")
    data = one_document(outcome.out)
    assert outcome.code == 1 and data["counts"]["open"] > 0
    for verdict in data["verdicts"]:
        if verdict["verdict"] == "open":
            assert set(verdict) >= {"prime", "id", "verdict", "reason", "hint"}
            assert verdict["reason"] and verdict["hint"]


def test_without_candidates(tmp_path: Path) -> None:
    """Exit code 1: the curve has points, so some classes survive, among them those of the points."""
    # as if the group were saturated at 2, 5 and 7
    word = 'generators_from = "known_points"\nindex_prime_to = [2, 5, 7]\nindex_source = "a supposition"'
    case = sextic_case(tmp_path, word)
    chosen = ("--bound", "300")
    outcome = sieve("run", case, "-o", tmp_path / "out", "--jobs", "1", *chosen, "--json")
    data = one_document(outcome.out)
    assert outcome.code == 1 and data["verdicts"] == []
    # tried before this program was written: these primes leave 26 classes in a quotient of order 40175230095
    # with the parts at l <= 13; more parts are used here
    count, quotient = data["survivors"]["count"], int(data["survivors"]["quotient"])
    assert count >= 10 and count * 40175230095 <= 26 * quotient
    assert len(data["survivors"]["vectors"]) == min(count, 1000)
    assert {p["source"] for p in data["premises"] if p["status"] == "assumed"} >= {"a supposition"}


def test_bound_and_primes_limit_the_verdicts(tmp_path: Path) -> None:
    outcome = demo(tmp_path / "a", "--json", "--bound", "60")
    used = {p for v in one_document(outcome.out)["verdicts"] for p in v.get("primes", [])}
    assert used and max(used) < 60
    outcome = demo(tmp_path / "b", "--json", "--primes", "59,113,7")
    used = {p for v in one_document(outcome.out)["verdicts"] for p in v.get("primes", [])}
    assert used and used <= {7, 59, 113}


def test_time_stops_the_run_and_says_so(tmp_path: Path) -> None:
    outcome = sieve(
        "run",
        sextic_case(tmp_path),
        "-o",
        tmp_path / "out",
        "--jobs",
        "1",
        "--bound",
        "1000",
        "--time",
        "0.01",
    )
    assert outcome.code == 1 and "time limit of 0.01 s" in outcome.out


def test_jobs_do_not_change_a_byte(tmp_path: Path) -> None:
    names = ("result.json", "proof.jsonl", "report.txt")
    for jobs in (1, 2):
        done = sieve_process(
            "run",
            sextic_case(tmp_path),
            "-o",
            f"out{jobs}",
            "--jobs",
            str(jobs),
            "--bound",
            "400",
            cwd=tmp_path,
        )
        assert done.code == 1
    for name in names:
        assert (tmp_path / "out1" / name).read_bytes() == (tmp_path / "out2" / name).read_bytes()


def test_verbose_talks_on_standard_error_only(tmp_path: Path) -> None:
    quiet, loud = demo(tmp_path / "a"), demo(tmp_path / "b", "-v")
    assert quiet.out == loud.out and quiet.err == "" and "usable" in loud.err


@pytest.mark.parametrize("command", ["run", "inspect", "candidates", "check"])
def test_help_has_an_example(command: str) -> None:
    outcome = sieve(command, "--help")
    assert outcome.code == 0 and f"Example: sieve {command} " in " ".join(outcome.out.split())
    assert "--json" in outcome.out and "-v" in outcome.out
    assert "Example: sieve run" in sieve("--help").out


def test_the_index_on_the_users_word(tmp_path: Path) -> None:
    """The two points over x = -1 generate a group of even index: 2 is used only on the user's word."""
    generators = "".join(
        f'[[jacobian.generators]]\ndivisor = [[1, "(-1 : {s} : 1)"], [-1, "(1 : 1 : 0)"]]\n' for s in (1, -1)
    )
    path = tmp_path / "case.toml"
    path.write_text(case_text(SEXTIC, 2, '"(1 : 1 : 0)"', known=SEXTIC_POINTS, more=generators), "utf-8")
    data = one_document(sieve("inspect", path, "--json", "--jobs", "1", "--bound", "20").out)
    assert 2 not in data["saturated_at"] and 2 in data["not_saturated_at"]
    assert {"1/2", "1/4"} & {c.lstrip("-") for p in data["known_points"] for c in p["coefficients"]}
    assert all(p["id"] != "saturated at 2" for p in data["premises"])
    path.write_text(
        case_text(
            SEXTIC, 2, '"(1 : 1 : 0)"',
            more='index_prime_to = [2, 101]\nindex_source = "no proof at all"\n' + generators,
        ),
        "utf-8",
    )  # fmt: skip
    data = one_document(sieve("inspect", path, "--json", "--jobs", "1", "--bound", "20").out)
    premise = next(p for p in data["premises"] if p["id"] == "saturated at 2")
    assert premise["status"] == "assumed" and premise["source"] == "no proof at all"
