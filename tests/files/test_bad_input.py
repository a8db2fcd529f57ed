"""Every file of the corpus of bad input is refused in one line that says where and why."""

from __future__ import annotations

import random
from pathlib import Path

import pytest

from sieve.errors import InputError, NotSupported, SieveError
from sieve.files.candidates import check_candidates, load_candidates
from sieve.files.case import load_case
from sieve.files.reading import MAX_BYTES, read_bytes, read_json, read_toml
from sieve.files.resolve import read_case, resolve

INSERTIONS = [b"0", b"-", b"9" * 30, b'"', b"(", b"^", b"\xc3\xa9", b"[", b"/0"]
BAD = Path(__file__).resolve().parents[2] / "data" / "bad"


def corpus() -> list[tuple[str, str, str, str]]:
    """The rows of expected.tsv: case, candidates or '-', stage, message."""
    rows = (BAD / "expected.tsv").read_text("utf-8").splitlines()
    out = []
    for row in rows[1:]:
        case, candidates, stage, message = row.split("\t")
        out.append((case, candidates, stage, message))
    return out


def name_of(row: tuple[str, str, str, str]) -> str:
    return row[0] if row[1] == "-" else row[1]


def load(case: Path, candidates: Path | None, stage: str) -> None:
    """Go through the stages up to the given one."""
    raw = load_case(case)
    file = load_candidates(candidates) if candidates else None
    if stage != "read":
        problem = resolve(raw)
        if file is not None:
            check_candidates(file, problem.curve, raw.rank, tuple(order for order, _ in problem.torsion))


@pytest.mark.parametrize("row", corpus(), ids=name_of)
def test_refused_with_the_recorded_message(row: tuple[str, str, str, str]) -> None:
    case, candidates, stage, message = row
    second = None if candidates == "-" else BAD / candidates
    if stage == "run":
        # well-formed, each statement true of the curve: only the whole job sees the contradiction
        load(BAD / case, second, stage)
        return
    if stage == "check":
        load(BAD / case, second, "read")
    with pytest.raises(InputError) as caught:
        load(BAD / case, second, stage)
    error = caught.value
    assert error.file == str(second or BAD / case)
    assert error.line.startswith(f"{error.file}: ")
    assert message in error.line[len(error.file) + 2 :]
    assert ", expected " in error.line
    assert str(error) == error.line and error.line.isprintable()
    assert len(error.line) - len(error.file) < 300
    assert isinstance(error, NotSupported) == ("in this version" in message)


def test_the_list_and_the_folders_agree() -> None:
    listed = [name_of(row) for row in corpus()]
    assert len(listed) == len(set(listed)) >= 60
    found = {str(p.relative_to(BAD)) for p in BAD.glob("*/*")}
    assert found == set(listed)


def test_the_good_files_are_good() -> None:
    load(BAD / "good.toml", BAD / "good.json", "check")


@pytest.mark.parametrize("name", ["good.toml", "good.json"])
def test_random_damage_never_crashes(name: str, tmp_path: Path) -> None:
    rng = random.Random(name)
    original = (BAD / name).read_bytes()
    path = tmp_path / name
    refused = 0
    for _ in range(400):
        data = bytearray(original)
        for _ in range(rng.randint(1, 3)):
            place = rng.randrange(len(data))
            kind = rng.randrange(4)
            if kind == 0:
                data[place] = rng.randrange(256)
            elif kind == 1:
                del data[place : place + rng.randint(1, 5)]
            elif kind == 2:
                data[place:place] = rng.choice(INSERTIONS)
            else:
                data[place:place] = data[rng.randrange(len(data)) :][: rng.randint(1, 12)]
        path.write_bytes(bytes(data))
        try:
            if name == "good.toml":
                load(path, None, "check")
            else:
                load(BAD / "good.toml", path, "check")
        except SieveError as error:
            assert isinstance(error, InputError) and error.file == str(path)
            refused += 1
    assert 200 < refused < 400


def test_files_that_cannot_be_read(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no such file"):
        load_case(tmp_path / "absent.toml")
    with pytest.raises(InputError, match="not a regular file"):
        load_candidates(tmp_path)
    with pytest.raises(InputError):
        read_bytes("name\0with nul")
    with pytest.raises(InputError, match=r"cannot be read|no such file"):
        read_bytes("x" * 5000)
    big = tmp_path / "big.toml"
    with big.open("wb") as stream:
        stream.truncate(MAX_BYTES + 1)
    with pytest.raises(InputError, match="very large file"):
        read_case(big)


def test_byte_order_mark_and_line_ends_are_tolerated(tmp_path: Path) -> None:
    case, candidates = tmp_path / "good.toml", tmp_path / "good.json"
    case.write_bytes(b"\xef\xbb\xbf" + (BAD / "good.toml").read_bytes().replace(b"\n", b"\r\n"))
    candidates.write_bytes(b"\xef\xbb\xbf" + (BAD / "good.json").read_bytes().replace(b"\n", b"\r\n"))
    load(case, candidates, "check")


def test_many_entries_are_refused(tmp_path: Path) -> None:
    path = tmp_path / "many.json"
    path.write_text('{"candidates": [' + "0," * 100_000 + "0]}", "utf-8")
    with pytest.raises(InputError, match="at most 100000 entries"):
        read_json(path).table.array("candidates", "a list")
    path.write_text("[[[", "utf-8")
    with pytest.raises(InputError, match="valid TOML"):
        read_toml(path)
