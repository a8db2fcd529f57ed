"""Mutants of proof logs: one small change in an accepted log, and the rule that says which may be accepted.

The rule.  The checker may accept a mutant only if

1. it claims the same theorem (curve, generators, candidates, fates, conclusion) from the same premises or
   fewer: then the change met a text, a label, or a witness, and what is left is a valid witness; or
2. it claims less of the same statement: no conclusion, no classes, a candidate open, a point not sole; or
3. the statement itself was changed (a candidate, a generator, a premise that is a number): then the mutant is
   another theorem with a complete proof of its own, and its claims must agree with the rational points of the
   curve, found by a search that knows nothing of the proof.
"""

from __future__ import annotations

import copy
import json
import random
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cache
from math import gcd, isqrt
from typing import Any

from sieve.proof.checker import STAGES, Malformed, Proof, decode
from tests.support.corpus_edits import dump

Records = list[Any]
Trail = tuple[Any, ...]


@dataclass(frozen=True)
class Mutant:
    """`kind` of the record that was changed, `what` was done, the records, and the bytes."""

    kind: str
    what: str
    data: bytes


def _leaves(value: Any, path: Trail = ()) -> Iterator[tuple[Trail, Any]]:
    """Every value inside a record with its path, containers included."""
    yield path, value
    if isinstance(value, dict):
        for key, inner in value.items():
            yield from _leaves(inner, (*path, key))
    elif isinstance(value, list):
        for i, inner in enumerate(value):
            yield from _leaves(inner, (*path, i))


def _changes(value: Any) -> Iterator[tuple[str, Any]]:
    """Small changes of a value."""
    if isinstance(value, bool):
        yield "flip", not value
    elif isinstance(value, int):
        for what, new in (("+ 1", value + 1), ("- 1", value - 1), ("negate", -value), ("times 2", 2 * value)):
            if new != value:
                yield what, new
    elif isinstance(value, str):
        yield "text", value + "x"
        if value in ("join", "semijoin"):
            yield "join for semijoin", "semijoin" if value == "join" else "join"
        if value in ("points", "empty", "none"):
            for other in ("points", "empty", "none"):
                if other != value:
                    yield f"conclude {other}", other
    elif isinstance(value, list):
        for i in range(len(value)):
            yield f"drop entry {i}", value[:i] + value[i + 1 :]
            yield f"repeat entry {i}", value[: i + 1] + value[i:]
        for i in range(len(value) - 1):
            if value[i] != value[i + 1]:
                yield f"exchange entries {i}", [*value[:i], value[i + 1], value[i], *value[i + 2 :]]
    elif isinstance(value, dict):
        for key in value:
            yield f"drop key {key}", {k: v for k, v in value.items() if k != key}


def _replaced(record: Any, path: Trail, new: Any) -> Any:
    if not path:
        return new
    copy = json.loads(dump(record))
    target = copy
    for key in path[:-1]:
        target = target[key]
    target[path[-1]] = new
    return copy


def _log(records: Records) -> bytes:
    return b"".join(dump(r) + b"\n" for r in records)


def _recounted(records: Records) -> Records:
    """With the number of records put right, so that a missing one is not noticed by counting alone."""
    if records and records[-1].get("kind") == "end":
        records = [*records[:-1], {**records[-1], "records": len(records) - 1}]
    return records


def mutants(data: bytes) -> list[tuple[str, str, Callable[[], bytes]]]:
    """All mutants of a log: (kind of the record, what was done, the bytes when wanted)."""
    lines = data.splitlines()
    records: Records = [json.loads(line) for line in lines]
    out: list[tuple[str, str, Callable[[], bytes]]] = []

    def change(i: int, path: Trail, what: str, new: Any) -> None:
        name = ".".join(map(str, path))
        out.append(
            (
                records[i]["kind"],
                f"line {i + 1}: {name}: {what}",
                lambda: b"\n".join(
                    [*lines[:i], dump(_replaced(records[i], path, new)), *lines[i + 1 :], b""]
                ),
            )
        )

    def rearrange(i: int, what: str, make: Callable[[], Records]) -> None:
        out.append((records[i]["kind"], f"line {i + 1}: {what}", lambda: _log(_recounted(make()))))

    for i, record in enumerate(records):
        for path, value in _leaves(record):
            for what, new in _changes(value):
                change(i, path, what, new)
        rearrange(i, "dropped", lambda i=i: records[:i] + records[i + 1 :])  # type: ignore[misc]
        rearrange(i, "repeated", lambda i=i: records[: i + 1] + records[i:])  # type: ignore[misc]
        if i + 1 < len(records):
            rearrange(
                i,
                "exchanged with the next",
                lambda i=i: [  # type: ignore[misc]
                    *records[:i],
                    records[i + 1],
                    records[i],
                    *records[i + 2 :],
                ],
            )
        out.append((record["kind"], f"line {i + 1}: cut off from here", lambda i=i: _log(records[:i])))  # type: ignore[misc]
        out.append(
            (
                record["kind"],
                f"line {i + 1}: cut in the middle",
                lambda i=i: _log(records[:i]) + dump(records[i])[: len(dump(records[i])) // 2],
            )
        )  # type: ignore[misc]
        if record["kind"] == "fate":
            out += _false_claims(records, i)
    return out


def _false_claims(records: Records, i: int) -> list[tuple[str, str, Callable[[], bytes]]]:
    """This candidate claimed eliminated: with no uses, and with the uses of every other fate."""
    fate = records[i]
    if fate["verdict"] == "eliminated":
        return []
    others = [r["uses"] for r in records if r["kind"] == "fate" and r["verdict"] == "eliminated"]
    order = [(r["prime"], r["id"]) for r in records if r["kind"] == "fate"]
    out: list[tuple[str, str, Callable[[], bytes]]] = []
    for uses in [[], *others[:3]]:
        new = {
            "kind": "fate",
            "prime": fate["prime"],
            "id": fate["id"],
            "verdict": "eliminated",
            "uses": uses,
        }
        listed = sorted(
            [*map(tuple, records[-1]["eliminated"]), (fate["prime"], fate["id"])], key=order.index
        )
        last = {**records[-1], "eliminated": [list(x) for x in listed]}
        log = [*records[:i], new, *records[i + 1 : -1], last]
        out.append(("fate", f"line {i + 1}: {fate['verdict']} claimed eliminated", lambda log=log: _log(log)))  # type: ignore[misc]
    return out


def sample(data: bytes, count: int, seed: int) -> list[Mutant]:
    """A number of mutants, the same for the same seed, or all of them."""
    found = mutants(data)
    if count < len(found):
        chosen = sorted(random.Random(seed).sample(range(len(found)), count))
        found = [found[i] for i in chosen]
    return [Mutant(kind, what, make()) for kind, what, make in found]


# ---- the rule ------------------------------------------------------------------------------------------


def statement(proof: Proof) -> Any:
    """What the theorem is about: curve, generators, candidates."""
    places = [(m.u, m.coordinates) for m in proof.places]
    candidates = [
        (c.prime, c.id, c.form, c.point, c.digits, c.multiplicity, c.coefficients, c.torsion)
        for c in proof.candidates.values()
    ]
    return (
        proof.curve.rows,
        proof.curve.weight,
        proof.integral,
        proof.rank,
        proof.base,
        proof.torsion,
        proof.generators,
        places,
        candidates,
    )


def claims(proof: Proof) -> Any:
    """What is said about it."""
    fates = [(c.prime, c.id, c.verdict, c.points, c.sole) for c in proof.fates]
    return fates, proof.count, proof.conclusion, sorted(proof.points), sorted(proof.zeros)


def premises(proof: Proof) -> set[tuple[str, Any]]:
    """The premises with their numbers."""
    return {(name, record.get("at_most")) for name, record in proof.premises.items()}


@cache
def rational_points(form: tuple[tuple[int, ...], ...], weight: int) -> list[tuple[int, int, int]]:
    """Rational points of small height in normal form, by trying X and Z."""
    height, out = (12, []) if weight == 1 else (60, [])
    for z in range(height + 1):
        for x in range(-height, height + 1):
            coefficients = [0] * (1 + max(k for _, _, k, _ in form))
            for c, i, k, j in form:
                coefficients[k] += c * x**i * z**j
            if weight == 1:
                options = list(range(-height, height + 1))
            else:
                c, b, _ = coefficients
                root = isqrt(max(0, b * b - 4 * c))
                options = sorted({(sign * root - b) // 2 for sign in (1, -1)})
            for y in options:
                if sum(c * y**k for k, c in enumerate(coefficients)) == 0 and _normal(x, y, z, weight):
                    out.append((x, y, z))
    return out


def _normal(x: int, y: int, z: int, weight: int) -> bool:
    if gcd(x, z) != 1 if weight > 1 else gcd(x, y, z) != 1:
        return False
    return z > 0 or (x == 1 if weight > 1 else x > 0 or (x == 0 and y == 1))


def agrees_with_points(proof: Proof) -> bool:
    """No rational point lies in an eliminated candidate, and a conclusion names all points."""
    known = rational_points(tuple(proof.curve.form), proof.curve.weight)
    known = [point for point in known if point[2] == 1 or not proof.integral]
    for c in proof.fates:
        if c.verdict == "eliminated" and c.point is not None and c.form != "coefficients":
            for point in known:
                if proof.curve.residue(point, c.prime**c.digits, c.prime) == c.point:
                    return False
    if proof.conclusion == "empty":
        return not known
    return proof.conclusion != "points" or set(known) <= set(proof.points)


def claims_less(original: Proof, mutant: Proof) -> bool:
    """Whether the claims of the mutant follow from those of the original."""
    for old, new in zip(original.fates, mutant.fates, strict=True):
        weaker = new.verdict == "open" or (old.verdict == new.verdict and old.points == new.points)
        if not weaker or (new.sole and not old.sole):
            return False
    same_end = (mutant.conclusion, sorted(mutant.points)) == (original.conclusion, sorted(original.points))
    fewer = mutant.count in (None, original.count) and set(mutant.zeros) <= set(original.zeros)
    return fewer and (mutant.conclusion == "none" or same_end)


class Replay:
    """Checks mutants of one log, starting from the state before the first line that differs.

    What is kept between mutants are forks of the state of the original; records are never skipped.
    """

    def __init__(self, data: bytes) -> None:
        self.lines = data.split(b"\n")
        self.states = [Proof()]
        for line in self.lines[:-1]:
            proof = _fork(self.states[-1])
            proof.read(decode(line))
            self.states.append(proof)

    def check(self, data: bytes) -> Proof:
        """The same verdict as `check`, as an exception or a proof."""
        lines = data.split(b"\n")
        start = 0
        while start < min(len(lines), len(self.lines)) - 1 and lines[start] == self.lines[start]:
            start += 1
        proof = _fork(self.states[start])
        if lines[-1]:
            raise Malformed("cut", "the last line has no end")
        for line in lines[start:-1]:
            proof.read(decode(line))
        if proof.stage != STAGES["end"]:
            raise Malformed("no-end", "the log has no end")
        return proof


def _fork(proof: Proof) -> Proof:
    """A copy that further records do not change."""
    new = copy.copy(proof)
    for name, value in vars(proof).items():
        if isinstance(value, list | dict):
            setattr(new, name, copy.copy(value))
    new.candidates = {key: copy.copy(c) for key, c in proof.candidates.items()}
    new.fates = [new.candidates[c.prime, c.id] for c in proof.fates]
    return new


def verdict(original: Proof, mutant: Proof) -> str:
    """Why an accepted mutant is right: "same theorem", "another theorem", or "" if it is not."""
    if statement(original) == statement(mutant) and premises(mutant) <= premises(original):
        if claims(original) == claims(mutant):
            return "same theorem"
        return "less" if claims_less(original, mutant) else ""
    if statement(original) != statement(mutant) or premises(original) != premises(mutant):
        return "another theorem" if agrees_with_points(mutant) else ""
    return ""
