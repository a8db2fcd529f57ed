"""The command line of `candidates` and `inspect --propose`: streams, files, exit codes, one-line errors."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from sieve.cli import main
from sieve.files.candidates import load_candidates

ROOT = Path(__file__).resolve().parents[2]
DEMO = str(ROOT / "data" / "demo-linear" / "case.toml")


def sieve(*arguments: str) -> Result:
    return CliRunner().invoke(main, [*arguments, "--jobs", "1"])


def test_the_file_goes_to_standard_output_or_where_it_is_told(tmp_path: Path) -> None:
    target = tmp_path / "c7.json"
    told = sieve("candidates", DEMO, "--prime", "7", "--precision", "6", "-o", str(target))
    assert told.exit_code == 0 and "12 candidates, 6 of them near no known rational point" in told.stdout
    plain = sieve("candidates", DEMO, "--prime", "7", "--precision", "6")
    assert plain.exit_code == 0 and plain.stdout == target.read_text("utf-8")
    file = load_candidates(target)
    assert (file.prime, file.precision, file.complete, len(file.candidates)) == (7, 6, True, 12)


def test_json(tmp_path: Path) -> None:
    target = tmp_path / "c7.json"
    result = sieve("candidates", DEMO, "--prime", "7", "--precision", "6", "--json", "-o", str(target))
    document, file = json.loads(result.stdout), json.loads(target.read_text("utf-8"))
    assert {key: document[key] for key in file} == file
    assert document["spurious"] == 6 and len(document["discs"]) == 12
    assert document["differentials"] == [{"coefficients": ["0", "1"], "precision": 8, "exact": True}]


def test_two_commands(tmp_path: Path) -> None:
    target = tmp_path / "c.json"
    assert sieve("candidates", DEMO, "-o", str(target)).exit_code == 0
    result = sieve("run", DEMO, "-c", str(target), "-o", str(tmp_path / "out"))
    assert result.exit_code == 0 and "X(Q) has exactly 6 points" in result.stdout


def test_proposal(tmp_path: Path) -> None:
    sketch, case = tmp_path / "sketch.toml", tmp_path / "case.toml"
    sketch.write_text(
        'format = "sieve-case/1"\nname = "new"\n[curve]\nequation = "y^2 = -3*x^6 - 3*x^4 - x^2 + 2"\n'
        '[jacobian]\nrank = 1\nrank_source = "PARI"\n', "utf-8",
    )
    result = sieve("inspect", str(sketch), "--propose")
    assert result.exit_code == 0 and 'base = "half a fibre"' in result.stdout
    case.write_text(result.stdout, "utf-8")
    result = sieve("run", str(case), "-o", str(tmp_path / "out"), "--bound", "150")
    assert result.exit_code == 0 and "X(Q) is empty." in result.stdout
    document = json.loads(sieve("inspect", str(sketch), "--propose", "--json").stdout)
    assert document["base"] == "half a fibre" and document["known_points"] == []


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["candidates", DEMO, "--prime", "5"], "--prime: 5, where the curve is not smooth, expected"),
        (["candidates", DEMO, "--prime", "2"], "--prime: 2, expected an odd prime"),
        (["candidates", DEMO, "--precision", "0"], "--precision: 0, expected between 1 and 1000 digits"),
        (["candidates", str(ROOT / "data/demo/case.toml")], "jacobian.rank: rank 2 for genus 2, expected"),
        (["candidates", "nowhere.toml"], "nowhere.toml: no such file"),
        (["candidates", DEMO, "--prime", "7", "-o", "/nowhere/c.json"], "/nowhere/c.json: cannot be written"),
        (["inspect", "--propose", "nowhere.toml"], "nowhere.toml: no such file"),
    ],
)
def test_one_line_errors(arguments: list[str], message: str) -> None:
    result = sieve(*arguments)
    assert result.exit_code == 2 and result.stdout == ""
    assert result.stderr.startswith("sieve: error: ") and result.stderr.count("\n") == 1
    assert message in result.stderr
