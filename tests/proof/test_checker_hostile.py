"""Logs made to exhaust or to crash the checker end in a refusal within 10 s and 1 GiB."""

from __future__ import annotations

import json
import re
import resource
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, BinaryIO

import pytest

from tests.support.checker_mutants import CORPUS, SOURCE

SECONDS, MEMORY = 10, 2**30

HEADER = (CORPUS / "accepted" / "torsion.jsonl").read_bytes().splitlines(keepends=True)[0]
PLANE = (CORPUS / "accepted" / "plane_points.jsonl").read_bytes().splitlines(keepends=True)
START = b"".join((CORPUS / "accepted" / "torsion.jsonl").read_bytes().splitlines(keepends=True)[:4])


def refused(path: Path) -> tuple[int, str]:
    """Exit code and the first line of what is printed, under the limits."""

    def limit() -> None:
        resource.setrlimit(resource.RLIMIT_AS, (MEMORY, MEMORY))

    done = subprocess.run(
        [sys.executable, "-I", "-S", "-O", str(SOURCE), str(path)],
        capture_output=True,
        timeout=SECONDS,
        preexec_fn=limit,
    )
    text = (done.stdout or done.stderr).decode()
    assert "Traceback" not in done.stderr.decode()
    assert re.match(r"(malformed|rejected): line \d+, |sieve: error: ", text)
    return done.returncode, text


def _gigabyte_line(file: BinaryIO) -> None:
    file.write(HEADER)
    # sparse: zeros that take no room on the disk
    file.truncate(2**30)


def _deep(file: BinaryIO) -> None:
    file.write(b'{"kind":' + b"[" * 1_000_000)


def _deep_and_closed(file: BinaryIO) -> None:
    file.write(b'{"kind":' + b"[" * 1_000_000 + b"]" * 1_000_000 + b"}\n")


def _deep_in_a_text(file: BinaryIO) -> None:
    file.write(json.dumps({"kind": "[" * 1_000_000}, separators=(",", ":")).encode() + b"\n")


def _broad(file: BinaryIO) -> None:
    file.write(b'{"kind":"header","f":[' + b",".join([b"[]"] * 1_200_000) + b"]}\n")


def _many_keys(file: BinaryIO) -> None:
    file.write(b'{"kind":"header",' + b",".join(b'"%d":0' % i for i in range(300_000)) + b"}\n")


def _million_digits(file: BinaryIO) -> None:
    file.write(HEADER.replace(b'"genus":2', b'"genus":' + b"9" * 1_000_000))


def _million_digits_after_a_sign(file: BinaryIO) -> None:
    file.write(HEADER.replace(b'"genus":2', b'"genus":-' + b"9" * 1_000_000))


def _power_of_ten(file: BinaryIO) -> None:
    file.write(HEADER.replace(b'"genus":2', b'"genus":1e999999999'))


def _quotation_marks(file: BinaryIO) -> None:
    file.write(b'{"kind":"' + b'\\"' * 1_900_000 + b"\n")


def _backslashes(file: BinaryIO) -> None:
    file.write(b'{"kind":"' + b"\\" * 3_900_000 + b"\n")


def _many_records(file: BinaryIO) -> None:
    file.write(START)
    for i in range(210_000):
        file.write(
            b'{"kind":"premise","id":"bound 5 c%d","statement":"a","source":"b","prime":5,'
            b'"candidate":"c%d","at_most":2}\n' % (i, i)
        )


def _many_factors(file: BinaryIO) -> None:
    file.write(START)
    factors = [[int("7" * 3000)]] * 1000
    record = {"kind": "branch", "factors": factors, "primes": []}
    file.write(json.dumps(record, separators=(",", ":")).encode() + b"\n")


def _wide_factor(file: BinaryIO) -> None:
    file.write(START)
    record = {"kind": "branch", "factors": [[1] * 900_000, [1] * 900_000], "primes": []}
    file.write(json.dumps(record, separators=(",", ":")).encode() + b"\n")


def _wide_section(file: BinaryIO) -> None:
    file.write(START)
    record = {
        "kind": "local",
        "prime": 5,
        "invariants": [19],
        "origin": 0,
        "unit": [0],
        "base": [],
        "define": [[[3, [1] * 1_000_000], []]],
        "close": [],
        "places": [],
        "counts": 0,
    }
    file.write(json.dumps(record, separators=(",", ":")).encode() + b"\n")


def _wide_vector(file: BinaryIO) -> None:
    file.write(START)
    record = {
        "kind": "local",
        "prime": 1009,
        "invariants": [2] * 1_000_000,
        "origin": 0,
        "unit": [0] * 1_000_000,
        "base": [],
        "define": [],
        "close": [],
        "places": [],
        "counts": 0,
    }
    file.write(json.dumps(record, separators=(",", ":")).encode() + b"\n")


def _large_coordinates(file: BinaryIO) -> None:
    file.write(HEADER)
    point = [int("3" * 3900), int("5" * 3900), int("7" * 3900) * 3 + 1]
    record = {
        "kind": "group",
        "rank": 0,
        "base": [[1, {"point": point}]] * 300,
        "free": [],
        "torsion": [],
        "integral": False,
    }
    file.write(json.dumps(record, separators=(",", ":")).encode() + b"\n")


def _large_coefficients(file: BinaryIO) -> None:
    assert b'"equation":[[' in HEADER
    file.write(HEADER.replace(b'"equation":[[', b'"equation":[[' + (b"9" * 3999 + b",") * 3))


def _large_multiplicities(file: BinaryIO) -> None:
    file.write(HEADER)
    record = {
        "kind": "group",
        "rank": 0,
        "base": [[int("9" * 3999), {"fibres": int("9" * 3999)}]],
        "free": [],
        "torsion": [],
        "integral": False,
    }
    file.write(json.dumps(record, separators=(",", ":")).encode() + b"\n")


def _plane(file: BinaryIO, *records: dict[str, Any]) -> None:
    """The start of a log on a plane quartic, and more records."""
    file.write(b"".join(PLANE[:4]))
    for record in records:
        file.write(json.dumps(record, separators=(",", ":")).encode() + b"\n")


def _local(v: int, **changes: Any) -> dict[str, Any]:
    record = {
        "kind": "local",
        "prime": v,
        "invariants": [2],
        "origin": 0,
        "unit": [0],
        "base": [],
        "define": [],
    }
    return {**record, "close": [], "places": [], "counts": 0, **changes}


def _plane_at_a_large_prime(file: BinaryIO) -> None:
    _plane(file, _local(1048573))


def _field_of_a_large_degree(file: BinaryIO) -> None:
    file.write(HEADER.replace(b'"weight":3', b'"weight":10000').replace(b'"genus":2', b'"genus":9999'))


def _equation_of_a_large_degree(file: BinaryIO) -> None:
    rows = [[1] * (1001 - k) for k in range(1001)]
    header = json.loads(PLANE[0]) | {"equation": rows}
    file.write(json.dumps(header, separators=(",", ":")).encode() + b"\n")


def _sections_of_a_large_degree(file: BinaryIO) -> None:
    dense = [60, *([3] * (61 - k) for k in range(61))]
    _plane(file, _local(5, define=[[dense, [0] * 240]] * 200))


def _place_of_a_large_degree(file: BinaryIO) -> None:
    u = [str(k) for k in range(2, 602)] + ["1"]
    place = {"closed": [u, ["7"] * 599 + ["5"], ["11"] * 599 + ["3"], ["13"] * 599 + ["2"]]}
    file.write(PLANE[0])
    record = {"kind": "group", "rank": 0, "base": [[1, place]], "free": [], "torsion": [], "integral": False}
    file.write(json.dumps(record, separators=(",", ":")).encode() + b"\n")


def _large_prime(file: BinaryIO) -> None:
    file.write(START)
    file.write(b'{"kind":"torsion","ell":' + b"1" * 3999 + b',"dimension":0,"by":5}\n')


def _surrogates(file: BinaryIO) -> None:
    file.write(b'{"kind":"header","\\udc80\\ud800":1}\n')


def _terminal(file: BinaryIO) -> None:
    file.write(b'{"kind":"header","\\u001b[2Jaccepted: 5 records\\n":1}\n')


HOSTILE: tuple[Callable[[BinaryIO], None], ...] = (
    _gigabyte_line,
    _deep,
    _deep_and_closed,
    _deep_in_a_text,
    _broad,
    _many_keys,
    _million_digits,
    _million_digits_after_a_sign,
    _power_of_ten,
    _quotation_marks,
    _backslashes,
    _many_records,
    _many_factors,
    _wide_factor,
    _wide_section,
    _wide_vector,
    _large_coordinates,
    _large_coefficients,
    _large_multiplicities,
    _large_prime,
    _plane_at_a_large_prime,
    _field_of_a_large_degree,
    _equation_of_a_large_degree,
    _sections_of_a_large_degree,
    _place_of_a_large_degree,
    _surrogates,
    _terminal,
)


@pytest.mark.parametrize("make", HOSTILE, ids=lambda make: make.__name__.strip("_"))
def test_hostile_logs_are_refused(make: Callable[[BinaryIO], None], tmp_path: Path) -> None:
    path = tmp_path / "hostile.jsonl"
    with path.open("wb") as file:
        make(file)
    code, text = refused(path)
    assert code in (2, 3)
    assert len(text) < 2000 and text.count("\n") == 1 and text.isprintable() is False
    assert "\x1b" not in text


@pytest.mark.parametrize("kind", ["malformed", "declined"])
def test_bad_texts_and_limits_are_refused_cheaply(kind: str) -> None:
    for path in sorted((CORPUS / kind).glob("*meant_to_hang*.jsonl")) + sorted(
        (CORPUS / kind).glob("*nest*.jsonl")
    ):
        assert refused(path)[0] in (2, 3)
