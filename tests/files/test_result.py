"""The result document: its keys, its bytes, and files that appear whole."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from sieve.errors import InputError
from sieve.files.result import (
    LocalGroup,
    Premise,
    Result,
    Survivors,
    Verdict,
    json_text,
    make_directory,
    write_result,
    write_whole,
)

RESULT = Result(
    name="sextic",
    sha256="0" * 64,
    verdicts=(
        Verdict(7, "z1", "eliminated", "no class", primes=(59, 73)),
        Verdict(7, "z2", "rational", point="(0 : 1 : 1)", given=True, sole=True),
        Verdict(7, "z3", "open", "one class is left", hint="add v = 191"),
    ),
    premises=(
        Premise("rank", "assumed", "the rank is 2", "invented"),
        Premise("saturated at 3", "proved", primes=(31, 53)),
    ),
    local=(LocalGroup(59, 48, 2916, (54, 54)),),
    survivors=Survivors(10**30, 2, ((0, 0), (-1, 10**20)), None),
    rational_points=("(0 : 1 : 1)",),
    statement="X(Q) ⊇ {(0 : 1 : 1)}",
)


def test_the_document_has_the_keys_of_the_format(tmp_path: Path) -> None:
    path = tmp_path / "result.json"
    write_result(path, RESULT)
    assert json.loads(path.read_text("utf-8")) == {
        "format": "sieve-result/1",
        "case": {"name": "sextic", "sha256": "0" * 64},
        "verdicts": [
            {"prime": 7, "id": "z1", "verdict": "eliminated", "primes": [59, 73], "reason": "no class"},
            {
                "prime": 7, "id": "z2", "verdict": "rational", "point": "(0 : 1 : 1)", "given": True,
                "sole": True,
            },
            {"prime": 7, "id": "z3", "verdict": "open", "reason": "one class is left", "hint": "add v = 191"},
        ],
        "counts": {"eliminated": 1, "rational": 1, "open": 1},
        "premises": [
            {"id": "rank", "status": "assumed", "statement": "the rank is 2", "source": "invented"},
            {"id": "saturated at 3", "status": "proved", "primes": [31, 53]},
        ],
        "local": [{"prime": 59, "points": 48, "order": "2916", "structure": ["54", "54"]}],
        "survivors": {
            "quotient": "1" + "0" * 30,
            "count": 2,
            "vectors": [["0", "0"], ["-1", "1" + "0" * 20]],
            "barrier": None,
        },
        "rational_points": ["(0 : 1 : 1)"],
        "statement": "X(Q) ⊇ {(0 : 1 : 1)}",
    }  # fmt: skip


def test_the_same_result_gives_the_same_bytes(tmp_path: Path) -> None:
    one, two = tmp_path / "one.json", tmp_path / "two.json"
    write_result(one, RESULT)
    two.write_text("old content", "utf-8")
    write_result(two, RESULT)
    assert one.read_bytes() == two.read_bytes() and one.read_bytes().endswith(b"}\n")
    assert sorted(p.name for p in tmp_path.iterdir()) == ["one.json", "two.json"]


def test_layout_is_json() -> None:
    for value in [{}, [], [[]], [{}], {"a": [[1, [2]], 3], "é\n": {"b": [None, True, "x\u2028"]}}, "x", 3]:
        assert json.loads(json_text(value)) == value
    with pytest.raises(ValueError):
        json_text({"a": float("nan")})
    with pytest.raises(TypeError):
        json_text({"a": {1}})


def test_places_that_cannot_be_written(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="cannot be written"):
        write_whole(tmp_path / "absent" / "file", "text")
    (tmp_path / "directory").mkdir()
    with pytest.raises(InputError, match="cannot be written"):
        write_whole(tmp_path / "directory", "text")
    assert sorted(p.name for p in tmp_path.iterdir()) == ["directory"]
    (tmp_path / "file").write_text("x", "utf-8")
    for target in (tmp_path / "file", tmp_path / "file" / "below"):
        with pytest.raises(InputError, match="cannot be made"):
            make_directory(target)
    made = make_directory(tmp_path / "a" / "b")
    assert made.is_dir() and make_directory(made) == made
