"""The tools that spoil accepted proof logs: edits of records, of their order and of their text."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

CORPUS = Path(__file__).resolve().parents[2] / "data" / "proofs"
FOLDERS = ("malformed", "rejected", "declined")
EXIT = {"malformed": 3, "rejected": 3, "declined": 2}


def dump(record: Any) -> bytes:
    """A record as a line without its newline."""
    return json.dumps(record, separators=(",", ":")).encode()


class Log:
    """An accepted log that is being spoilt: parsed records, and lines that replace their text."""

    def __init__(self, name: str) -> None:
        data = (CORPUS / "accepted" / f"{name}.jsonl").read_bytes()
        self.records: list[Any] = [json.loads(line) for line in data.splitlines()]
        self.raw: dict[int, bytes] = {}
        self.tail = b"\n"

    def find(self, kind: str, n: int = 0, **wanted: Any) -> int:
        """The index of the n-th record of a kind with the given fields."""
        found = [
            i
            for i, r in enumerate(self.records)
            if r["kind"] == kind and all(r.get(k) == v for k, v in wanted.items())
        ]
        return found[n]

    def data(self) -> bytes:
        """The bytes of the log."""
        lines = [self.raw.get(i, None) or dump(r) for i, r in enumerate(self.records)]
        lines = [b"" if self.raw.get(i) == b"" else line for i, line in enumerate(lines)]
        return b"\n".join(lines) + self.tail if lines else b""


Edit = Callable[[Log], int]
"""Spoils the log; returns the index of the record that must be blamed."""


@dataclass(frozen=True)
class Trap:
    folder: str
    name: str
    source: str
    edit: Edit
    code: str


def put(kind: str, *path: Any, value: Any, n: int = 0, blame: str = "", **wanted: Any) -> Edit:
    """Replace the value at a path in a record; `value` may be a function of the old value."""

    def edit(log: Log) -> int:
        i = log.find(kind, n, **wanted)
        target = log.records[i]
        for key in path[:-1]:
            target = target[key]
        target[path[-1]] = value(target[path[-1]]) if callable(value) else value
        return log.find(blame) if blame else i

    return edit


def drop(kind: str, n: int = 0, blame: str = "", m: int = 0, **wanted: Any) -> Edit:
    """Leave a record out and correct the number of records; the blame goes to what needs it."""

    def edit(log: Log) -> int:
        i = log.find(kind, n, **wanted)
        del log.records[i]
        log.records[-1]["records"] = len(log.records) - 1
        return log.find(blame, m) if blame else i

    return edit


def text(kind: str, old: bytes, new: bytes, n: int = 0) -> Edit:
    """Replace bytes of a line."""

    def edit(log: Log) -> int:
        i = log.find(kind, n)
        line = log.raw.get(i) or dump(log.records[i])
        assert old in line
        log.raw[i] = line.replace(old, new, 1)
        return i

    return edit


def twice(kind: str, n: int = 0) -> Edit:
    """Repeat a record right after itself."""

    def edit(log: Log) -> int:
        i = log.find(kind, n)
        log.records.insert(i + 1, json.loads(dump(log.records[i])))
        return i + 1

    return edit


def move(kind: str, place: int, n: int = 0, blame: int | None = None) -> Edit:
    """Move a record to an index."""

    def edit(log: Log) -> int:
        i = log.find(kind, n)
        log.records.insert(place, log.records.pop(i))
        return place if blame is None else blame

    return edit


def whole(change: Callable[[Log], int]) -> Edit:
    """Any other edit."""
    return change


def _known_point_eliminated(log: Log) -> int:
    """A candidate that is a rational point gets the uses that kill another one."""
    uses = log.records[log.find("fate", verdict="eliminated")]["uses"]
    i = log.find("fate", verdict="rational")
    old = log.records[i]
    log.records[i] = {
        "kind": "fate",
        "prime": old["prime"],
        "id": old["id"],
        "verdict": "eliminated",
        "uses": uses,
    }
    log.records[-1]["eliminated"].insert(0, [old["prime"], old["id"]])
    return i


def _vectors(value: list[list[int]]) -> Edit:
    """A classes record with the one class of L/L and given vectors."""

    def edit(log: Log) -> int:
        n = len(log.records[log.find("group")]["free"]) + len(log.records[log.find("group")]["torsion"])
        vectors = [(v + [0] * n)[:n] for v in value]
        record = {"kind": "classes", "uses": [], "count": 1, "index": 1, "vectors": vectors}
        log.records.insert(-1, record)
        log.records[-1]["records"] += 1
        return len(log.records) - 2

    return edit


def add(number: int) -> Callable[[Any], Any]:
    """Add to a number."""
    return lambda value: value + number


def without(index: int) -> Callable[[Any], Any]:
    """A list without one entry."""
    return lambda value: [x for i, x in enumerate(value) if i != index % len(value)]


class Traps(list[Trap]):
    """A list of traps that grows by folder."""

    def malformed(self, name: str, code: str, edit: Edit, source: str = "torsion") -> None:
        self.append(Trap("malformed", name, source, edit, code))

    def rejected(self, name: str, code: str, edit: Edit, source: str = "torsion") -> None:
        self.append(Trap("rejected", name, source, edit, code))

    def declined(self, name: str, edit: Edit, source: str = "torsion") -> None:
        self.append(Trap("declined", name, source, edit, "declined"))
