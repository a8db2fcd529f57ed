"""Bad input: one line on standard error, exit code 2, nothing else."""

from __future__ import annotations

import shutil
import sqlite3
from pathlib import Path

import pytest

from tests.support.command_line import ROOT, Outcome, sextic_case, sieve, sieve_process

BAD = ROOT / "data" / "bad"


def corpus() -> list[tuple[str, str, str]]:
    """Case, candidates or '-', fragment of the message."""
    rows = [row.split("\t") for row in (BAD / "expected.tsv").read_text("utf-8").splitlines()[1:]]
    return [(case, candidates, message) for case, candidates, _, message in rows]


def assert_refused(done: Outcome, fragment: str) -> None:
    assert done.code == 2 and done.out == ""
    assert done.err.startswith("sieve: error: ") and done.err.endswith("\n")
    assert done.err.count("\n") == 1 and "Traceback" not in done.err
    assert fragment in done.err and ", expected " in done.err


@pytest.fixture(scope="module")
def store(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """One store for all cases, so that local data are computed once."""
    return tmp_path_factory.mktemp("store") / "local.sqlite"


@pytest.mark.parametrize("row", corpus(), ids=lambda row: row[0] if row[1] == "-" else row[1])
def test_the_corpus(row: tuple[str, str, str], store: Path, tmp_path: Path) -> None:
    case, candidates, fragment = row
    more = [] if candidates == "-" else ["-c", BAD / candidates]
    done = sieve("run", BAD / case, *more, "-o", tmp_path / "out", "--jobs", "1", "--store", store)
    assert_refused(done, fragment)
    # the file to blame is named
    assert str(BAD / (case if candidates == "-" else candidates)) in done.err
    assert not (tmp_path / "out" / "result.json").exists()


@pytest.mark.parametrize("pick", [0, 40, 80, 120, -1])
def test_some_in_processes_of_their_own(pick: int, tmp_path: Path) -> None:
    case, candidates, fragment = corpus()[pick]
    more = [] if candidates == "-" else ["-c", BAD / candidates]
    assert_refused(sieve_process("run", BAD / case, *more, "-o", "out", cwd=tmp_path), fragment)


@pytest.mark.parametrize("row", corpus()[:60:6], ids=lambda row: row[0])
def test_inspect_refuses_the_same(row: tuple[str, str, str]) -> None:
    case, candidates, fragment = row
    if candidates == "-":
        assert_refused(sieve("inspect", BAD / case, "--jobs", "1", "--bound", "20"), fragment)


@pytest.mark.parametrize(
    ("arguments", "fragment"),
    [
        (["run"], "Missing argument"),
        (["runn"], "No such command"),
        (["run", "CASE", "--frobnicate"], "No such option"),
        (["run", "CASE", "--primes", "59,60"], "'60'"),
        (["run", "CASE", "--primes", ""], "--primes"),
        (["run", "CASE", "--primes", "59;61"], "--primes"),
        (["run", "CASE", "--primes", "1048583"], "below 2^20"),
        (["run", "CASE", "--bound", "2"], "a bound between 3"),
        (["run", "CASE", "--bound", "-5"], "a bound between 3"),
        (["run", "CASE", "--bound", "ten"], "--bound"),
        (["run", "CASE", "--time", "0"], "positive number of seconds"),
        (["run", "CASE", "--time", "nan"], "positive number of seconds"),
        (["run", "CASE", "--time", "soon"], "--time"),
        (["run", "CASE", "--jobs", "-1"], "--jobs"),
        (["run", "CASE", "-c", "absent.json"], "no such file"),
        (["run", "CASE", "-o", "CASE"], "a directory"),
        (["run", "absent.toml"], "no such file"),
        (["inspect", "CASE", "--padic", "7"], "P:N"),
        (["inspect", "CASE", "--padic", "9:5"], "not a prime"),
        (["inspect", "CASE", "--padic", "7:0"], "digits"),
        (["inspect", "CASE", "--padic", "67:4"], "not smooth"),
        (["inspect", "CASE", "--primes", "4"], "'4'"),
        (["inspect"], "Missing argument"),
    ],
    ids=lambda value: " ".join(value) if isinstance(value, list) else "",
)
def test_usage(arguments: list[str], fragment: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    case = str(sextic_case(tmp_path))
    assert_refused(sieve(*[case if a == "CASE" else a for a in arguments]), fragment)


@pytest.mark.parametrize("damage", ["text", "other database", "other version", "cut", "flipped", "directory"])
def test_a_store_that_cannot_be_used_is_left_alone(damage: str, tmp_path: Path) -> None:
    case, store = sextic_case(tmp_path), tmp_path / "kept.sqlite"
    arguments = ["run", case, "-o", tmp_path / "out", "--jobs", "1", "--store", store, "--primes", "59,73"]
    if damage == "text":
        store.write_text("no store\n", "utf-8")
    elif damage == "directory":
        store.mkdir()
    elif damage == "other database":
        with sqlite3.connect(store) as connection:
            connection.execute("CREATE TABLE cats (name TEXT)")
        connection.close()
    else:
        assert sieve(*arguments).code == 1
        if damage == "other version":
            with sqlite3.connect(store) as connection:
                connection.execute("UPDATE about SET value = '999' WHERE key = 'schema'")
            connection.close()
        elif damage == "cut":
            data = store.read_bytes()
            store.write_bytes(data[: len(data) // 2])
        else:
            with sqlite3.connect(store) as connection:
                connection.execute("UPDATE local SET record = replace(record, '\"order\":', '\"order\":1')")
            connection.close()
    before = None if damage == "directory" else store.read_bytes()
    done = sieve(*arguments)
    assert done.code == 2 and done.out == "" and done.err.count("\n") == 1
    assert done.err.startswith("sieve: error: ") and str(store) in done.err
    if before is not None:
        assert store.read_bytes() == before


def test_output_that_cannot_be_written(tmp_path: Path) -> None:
    case = sextic_case(tmp_path)
    (tmp_path / "out").write_text("a file", "utf-8")
    done = sieve("run", case, "-o", tmp_path / "out" / "deeper", "--jobs", "1", "--primes", "59")
    assert done.code == 2 and done.err.count("\n") == 1 and done.out == ""
    shutil.rmtree(tmp_path)
