"""The result file: what was decided, in one deterministic JSON document; files appear whole or not at all.

Keys come in the order in which they are declared here; integers that can exceed 2^53 are written as strings.
"""

from __future__ import annotations

import json
import os
import tempfile
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

from sieve.curves.notation import Origin

FORMAT = "sieve-result/1"
VerdictName = Literal["eliminated", "rational", "open"]
VERDICTS: tuple[VerdictName, ...] = ("eliminated", "rational", "open")


@dataclass(frozen=True)
class Verdict:
    """The fate of one candidate.

    Fields: `prime` and `id` of the candidate; `verdict`; `reason` (a sentence); `primes`, the auxiliary
    primes responsible (eliminated); `point` as text, `given` (it is a known point of the case) and `sole` (no
    second rational point is possible there) for rational ones; `hint`, what might help an open one.
    """

    prime: int
    id: str
    verdict: VerdictName
    reason: str = ""
    primes: tuple[int, ...] = ()
    point: str = ""
    given: bool = False
    sole: bool = False
    hint: str = ""

    def document(self) -> dict[str, Any]:
        """The JSON object of this verdict; each kind has its own keys."""
        out: dict[str, Any] = {"prime": self.prime, "id": self.id, "verdict": self.verdict}
        if self.verdict == "eliminated":
            return out | {"primes": list(self.primes), "reason": self.reason}
        if self.verdict == "rational":
            out |= {"point": self.point, "given": self.given, "sole": self.sole}
            return out | ({"reason": self.reason} if self.reason else {})
        return out | {"reason": self.reason, "hint": self.hint}


@dataclass(frozen=True)
class Premise:
    """What the verdicts rest on: "assumed" with its `source`, or "proved" with the `primes` that prove it."""

    id: str
    status: Literal["assumed", "proved"]
    statement: str = ""
    source: str = ""
    primes: tuple[int, ...] = ()

    def document(self) -> dict[str, Any]:
        """The JSON object of this premise."""
        out: dict[str, Any] = {"id": self.id, "status": self.status}
        if self.statement:
            out["statement"] = self.statement
        return out | ({"source": self.source} if self.status == "assumed" else {"primes": list(self.primes)})


@dataclass(frozen=True)
class LocalGroup:
    """J(F_v) at one auxiliary prime: `points` is #X(F_v), `structure` the nontrivial invariant factors."""

    prime: int
    points: int
    order: int
    structure: tuple[int, ...]

    def document(self) -> dict[str, Any]:
        """The JSON object of this group."""
        structure = [str(n) for n in self.structure]
        return {"prime": self.prime, "points": self.points, "order": str(self.order), "structure": structure}


@dataclass(frozen=True)
class Survivors:
    """The classes left in a quotient of order `quotient`, as short vectors; `barrier` None when unknown."""

    quotient: int
    count: int
    vectors: tuple[tuple[int, ...], ...]
    barrier: int | None

    def document(self) -> dict[str, Any]:
        """The JSON object of the survivors; an unknown barrier is null."""
        return {
            "quotient": str(self.quotient),
            "count": self.count,
            "vectors": [[str(n) for n in row] for row in self.vectors],
            "barrier": None if self.barrier is None else str(self.barrier),
        }


@dataclass(frozen=True)
class Result:
    """Everything `result.json` says about one run."""

    name: str
    sha256: str
    verdicts: tuple[Verdict, ...]
    premises: tuple[Premise, ...]
    local: tuple[LocalGroup, ...]
    survivors: Survivors | None
    rational_points: tuple[str, ...]
    statement: str

    def document(self) -> dict[str, Any]:
        """The JSON document; `survivors` is null when no class was computed."""
        counts = {name: sum(v.verdict == name for v in self.verdicts) for name in VERDICTS}
        return {
            "format": FORMAT,
            "case": {"name": self.name, "sha256": self.sha256},
            "verdicts": [v.document() for v in self.verdicts],
            "counts": counts,
            "premises": [p.document() for p in self.premises],
            "local": [g.document() for g in self.local],
            "survivors": None if self.survivors is None else self.survivors.document(),
            "rational_points": list(self.rational_points),
            "statement": self.statement,
        }


def json_text(document: Any) -> str:
    """A JSON document as text: keys in the given order, two spaces of indentation, a newline at the end.

    Lists of plain values stay on one line.  NaN, infinities and values that are not plain Python objects are
    programming errors and raise `ValueError` or `TypeError`.

    >>> print(json_text({"a": [1, "2"], "b": {}}), end="")
    {
      "a": [1, "2"],
      "b": {}
    }
    """
    return _layout(document, "") + "\n"


def _layout(value: Any, indent: str) -> str:
    inner = indent + "  "
    if isinstance(value, dict) and value:
        rows = [f"{inner}{_plain(str(key))}: {_layout(item, inner)}" for key, item in value.items()]
        return "{\n" + ",\n".join(rows) + f"\n{indent}}}"
    if isinstance(value, list) and any(isinstance(item, (dict, list)) for item in value):
        rows = [inner + _layout(item, inner) for item in value]
        return "[\n" + ",\n".join(rows) + f"\n{indent}]"
    return _plain(value)


def _plain(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False)


def write_result(path: str | Path, result: Result) -> None:
    """Write `result.json`; see `write_whole`."""
    write_whole(path, json_text(result.document()))


def write_whole(path: str | Path, text: str) -> None:
    """Write a UTF-8 file so that a reader sees the old content or the new, never a part.

    A temporary file in the same directory replaces the old file.  Raises `InputError` with the path when the
    directory is missing or not writable.
    """
    target = Path(path)
    temporary = ""
    try:
        handle, temporary = tempfile.mkstemp(prefix=f".{target.name}.", dir=target.parent)
        with os.fdopen(handle, "w", encoding="utf-8", newline="\n") as stream:
            stream.write(text)
            stream.flush()
            os.fsync(stream.fileno())
        mask = os.umask(0)
        os.umask(mask)
        os.chmod(temporary, 0o666 & ~mask)
        os.replace(temporary, target)
    except OSError as error:
        if temporary:
            Path(temporary).unlink(missing_ok=True)
        reason = error.strerror or str(error)
        raise Origin(str(path)).error(f"cannot be written ({reason})", "a writable place") from None


def make_directory(path: str | Path) -> Path:
    """The output directory, created with its parents when absent.

    Raises `InputError` when it cannot be made or something else stands there.
    """
    directory = Path(path)
    try:
        directory.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        reason = error.strerror or str(error)
        raise Origin(str(path)).error(f"cannot be made ({reason})", "a directory") from None
    return directory
